package store

import (
	"context"
	"crypto/sha256"
	"database/sql"
	"errors"
	"fmt"
	"iter"

	"ringbook/snubber"
	"ringbook/snubber/waveform"
)

// Waveform is a captured edge as it was logged with its trial.
type Waveform struct {
	ID      string // UUIDv7 in its 36-character text form
	TrialID string // its trial's
	waveform.Record
}

// AddWithWaveforms logs one trial as Add does, and with it the captures its readings were taken from, in one transaction:
// when it returns, all of it is on the disk, and a process killed before leaves all of it or nothing. The samples are
// kept bit for bit.
//
// Each record must pass its Check. Readings computed from the samples say so by FromWaveform, which nothing here sets.
func (lb *Logbook) AddWithWaveforms(ctx context.Context, t snubber.Trial, records []waveform.Record) (id string, err error) {
	if err := checkNew(t); err != nil {
		return "", fmt.Errorf("log the trial: %w", err)
	}
	// Packed before the turn to write is taken: no other program waits for it.
	waveforms := make([]packed, len(records))
	for i, r := range records {
		if err := ctx.Err(); err != nil {
			return "", fmt.Errorf("log the trial: %w", err)
		}
		if waveforms[i], err = packRecord(r); err != nil {
			return "", fmt.Errorf("log the trial: waveform %d: %w", i+1, err)
		}
	}
	err = lb.write(ctx, func(w *writer) error {
		id, err = w.add(context.WithoutCancel(ctx), t, waveforms)
		return err
	})
	if err != nil {
		return "", fmt.Errorf("log the trial: %w", err)
	}
	return id, nil
}

// Waveforms streams the waveforms of a trial, struck or not, in the order they were logged, one at a time in memory. The
// trial is named as for Logbook.Trial; errors are of kind ErrNoTrial where there is none.
//
// The samples' SHA-256 is looked at, and one that is damaged yields its ids and an error of kind ErrDamaged, after which
// the next follows. After any other error the sequence ends.
func (lb *Logbook) Waveforms(ctx context.Context, trial string) iter.Seq2[Waveform, error] {
	return func(yield func(Waveform, error) bool) {
		fail := func(err error) { yield(Waveform{}, fmt.Errorf("read waveforms: %w", explain(lb.path, err))) }
		seq, trialID, err := aTrial.find(ctx, lb.db, trial)
		if err != nil {
			fail(err)
			return
		}
		step := "ifnull(step_v, 0)"
		if schema, err := schemaOf(ctx, lb.db); err != nil {
			fail(err)
			return
		} else if schema < 3 {
			step = "0"
		}
		rows, err := lb.db.QueryContext(ctx, fmt.Sprintf(selectWaveforms, step), seq)
		if err != nil {
			fail(err)
			return
		}
		defer rows.Close()
		for rows.Next() {
			w, err := lb.scanWaveform(rows, trialID)
			var damaged *Fault
			if err != nil && !errors.As(err, &damaged) {
				fail(err)
				return
			}
			if !yield(w, err) {
				return
			}
		}
		if err := rows.Err(); err != nil {
			fail(err)
		}
	}
}

const (
	insertWaveform = `INSERT INTO waveform (id, trial, start_s, interval_s, step_v, samples, encoding, sha256, origin)
  VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?)`
	selectWaveforms = `SELECT id, start_s, interval_s, %s, samples, encoding, sha256, ifnull(origin, '')
FROM waveform WHERE trial = ? ORDER BY seq`
)

// packed is a record with its samples as its row holds them.
type packed struct {
	id string
	waveform.Record
	samples  []byte
	encoding string
	digest   [sha256.Size]byte // of samples
}

func packRecord(r waveform.Record) (packed, error) {
	if err := r.Check(); err != nil {
		return packed{}, err
	}
	if err := checkText("origin", r.Origin); err != nil {
		return packed{}, err
	}
	if len(r.Origin) > maxText {
		return packed{}, bad("origin", "it has %d bytes; it may have %d", len(r.Origin), maxText)
	}
	p := packed{Record: r}
	var err error
	if p.samples, p.encoding, err = waveform.Pack(r.Volts); err != nil {
		return packed{}, err
	}
	p.digest = sha256.Sum256(p.samples)
	return p, nil
}

func (w *writer) addWaveform(ctx context.Context, trial int64, p *packed) error {
	_, err := w.insert(ctx, insertWaveform, p.id, trial, p.Start, p.Interval, orNull(p.StepV), p.samples, p.encoding, p.digest[:], orNull(p.Origin))
	return err
}

// scanWaveform reads one row. What is wrong with the row itself is a Fault.
func (lb *Logbook) scanWaveform(rows *sql.Rows, trial string) (Waveform, error) {
	w := Waveform{TrialID: trial}
	var samples, digest sql.RawBytes // SQLite's own until the next row: no second copy
	var encoding string
	if err := rows.Scan(&w.ID, &w.Start, &w.Interval, &w.StepV, &samples, &encoding, &digest, &w.Origin); err != nil {
		return w, err
	}
	fault := func(what string, err error) (Waveform, error) {
		return Waveform{ID: w.ID, TrialID: trial}, &Fault{Path: lb.path, Kind: ErrDamaged, Err: err,
			What: fmt.Sprintf("waveform %s of trial %s is damaged: %s", w.ID, trial, what),
			Cure: "take it from a backup; the trial's readings stand as they were logged"}
	}
	if sum := sha256.Sum256(samples); string(sum[:]) != string(digest) {
		return fault("its samples are not those of its SHA-256", nil)
	}
	var err error
	if w.Volts, err = waveform.Unpack(samples, encoding); err != nil {
		return fault(err.Error(), err)
	}
	if err := w.Check(); err != nil {
		return fault(err.Error(), err)
	}
	return w, nil
}
