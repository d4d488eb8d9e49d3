package store

import (
	"context"
	"fmt"
	"iter"
	"slices"
	"strings"
	"time"

	"github.com/google/uuid"

	"ringbook/snubber"
)

// Add logs one trial and gives it its id, a UUID version 7. Its board, revision and session are made when new. When Add
// returns, the trial is on the disk.
//
// A trial without a time is dated at its logging. A trial with Struck set is logged as struck. The trial must pass
// Check, and must not have an id: one that has is in a logbook already.
func (lb *Logbook) Add(ctx context.Context, t snubber.Trial) (id string, err error) {
	return lb.AddWithWaveforms(ctx, t, nil)
}

// AddAll logs every trial of trials in one transaction, or none: the first error of the sequence, or of a trial that
// fails its check, takes all of them back. It holds one trial at a time in memory. progress, unless nil, is told the count
// so far every thousand trials. Other programs can read meanwhile, and have to wait to write; the sequence itself must not
// write to this logbook, or it waits for itself.
func (lb *Logbook) AddAll(ctx context.Context, trials iter.Seq2[snubber.Trial, error], progress func(n int)) (n int, err error) {
	// Each insert is short and ctx is looked at between them; watching it inside each would double their cost.
	unwatched := context.WithoutCancel(ctx)
	err = lb.write(ctx, func(w *writer) error {
		for t, err := range trials {
			if err != nil {
				return err
			}
			if err := ctx.Err(); err != nil {
				return err
			}
			if err := checkNew(t); err != nil {
				return fmt.Errorf("trial %d of board %s: %w", n+1, quote(t.Board), err)
			}
			if _, err := w.add(unwatched, t, nil); err != nil {
				return err
			}
			if n++; progress != nil && n%1000 == 0 {
				progress(n)
			}
		}
		return nil
	})
	if err != nil {
		return 0, err
	}
	return n, nil
}

// timeLayout is RFC 3339 in UTC of one length, so that the order of the text is the order of time.
const timeLayout = "2006-01-02T15:04:05.000000000Z"

func timeText(t time.Time) string { return t.UTC().Format(timeLayout) }

const (
	insertTrial = `INSERT INTO trial (id, revision, session, operating_point, at, logged_at, network,
  c, c_tol, r, r_tol, esr, measured_c, measured_c_u, probe_c, part, note)
  VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`
	insertReading = `INSERT INTO reading (trial, quantity, value, u, instrument, from_waveform) VALUES (?, ?, ?, ?, ?, ?)`
	insertRepeat  = `INSERT INTO reading_repeat (trial, quantity, n, value) VALUES (?, ?, ?, ?)`
	insertStrike  = `INSERT INTO strike (id, trial, at, because) VALUES (?, ?, ?, ?)`
)

// add logs t under a new id, as struck where it says so.
func (w *writer) add(ctx context.Context, t snubber.Trial, waveforms []packed) (string, error) {
	now := time.Now().UTC()
	if t.At.IsZero() {
		t.At = now
	}
	ids, err := newIDs(1 + len(waveforms))
	if err != nil {
		return "", err
	}
	t.ID = ids[0]
	for i := range waveforms {
		waveforms[i].id = ids[1+i]
	}
	seq, err := w.addTrial(ctx, &loggedTrial{t, now, waveforms}, nil)
	if err != nil {
		return "", err
	}
	if t.Struck != "" {
		if err := w.strike(ctx, seq, t.ID, now, t.Struck); err != nil {
			return "", err
		}
	}
	return t.ID, nil
}

// addTrial writes a trial's rows and its entry in the chain. Its strike is another entry.
func (w *writer) addTrial(ctx context.Context, t *loggedTrial, origin *place) (seq int64, err error) {
	revision, err := w.revision(ctx, t.Board, t.Revision)
	if err != nil {
		return 0, err
	}
	session, err := w.session(ctx, t.Session)
	if err != nil {
		return 0, err
	}
	point, err := w.point(ctx, t.Point)
	if err != nil {
		return 0, err
	}
	n := t.Network
	seq, err = w.insert(ctx, insertTrial, t.ID, revision, session, point, timeText(t.At), timeText(t.loggedAt), string(n.Kind),
		orNull(n.C), orNull(n.CTol), orNull(n.R), orNull(n.RTol), orNull(n.ESR), orNull(n.MeasuredC), orNull(n.MeasuredU),
		orNull(t.ProbeC), orNull(t.Part), orNull(t.Note))
	if err != nil {
		return 0, err
	}
	for i := range t.waveforms {
		if err := w.addWaveform(ctx, seq, &t.waveforms[i]); err != nil {
			return 0, err
		}
	}
	if err := w.addReadings(ctx, seq, t.Readings); err != nil {
		return 0, err
	}
	if err := w.chain(ctx, &entry{trial: t}, seq, origin); err != nil {
		return 0, err
	}
	return seq, w.index(ctx, seq, len(t.Part)+len(t.Note))
}

// addReadings writes all readings of a trial by one statement, and their repeats after them.
func (w *writer) addReadings(ctx context.Context, seq int64, readings []snubber.Reading) error {
	if len(readings) == 0 {
		return nil
	}
	args := w.args[:0]
	for i := range readings {
		r := &readings[i]
		device, err := w.instrument(ctx, r.Instrument)
		if err != nil {
			return err
		}
		args = append(args, seq, string(r.Quantity), r.Value, orNull(r.U), device, orNull(r.FromWaveform))
	}
	w.args = args
	if _, err := w.insert(ctx, insertReadings(len(readings)), args...); err != nil {
		return err
	}
	for _, r := range readings {
		for i, v := range r.Repeats {
			if _, err := w.insert(ctx, insertRepeat, seq, string(r.Quantity), i+1, v); err != nil {
				return err
			}
		}
	}
	return nil
}

// insertReadings is insertReading for n readings; there are no more than there are quantities.
func insertReadings(n int) string {
	const row = "(?, ?, ?, ?, ?, ?)"
	return insertReading + strings.Repeat(", "+row, n-1)
}

func (w *writer) strike(ctx context.Context, seq int64, trial string, at time.Time, because string) error {
	ids, err := newIDs(1)
	if err != nil {
		return err
	}
	return w.addStrike(ctx, seq, &loggedStrike{ids[0], trial, at, because}, nil)
}

// addStrike writes the strike of trial seq and its entry in the chain.
func (w *writer) addStrike(ctx context.Context, trial int64, s *loggedStrike, origin *place) error {
	seq, err := w.insert(ctx, insertStrike, s.id, trial, timeText(s.at), s.because)
	if err != nil {
		return err
	}
	return w.chain(ctx, &entry{strike: s}, seq, origin)
}

// newIDs are n new ids in order.
func newIDs(n int) ([]string, error) {
	ids := make([]string, n)
	for i := range ids {
		id, err := uuid.NewV7()
		if err != nil {
			return nil, fmt.Errorf("make an id: %w", err)
		}
		ids[i] = id.String()
	}
	return ids, nil
}

// orNull is v, or NULL for the zero value that means "not stated".
func orNull[T comparable](v T) any {
	var zero T
	if v == zero {
		return nil
	}
	return v
}

// inOrder sorts readings as snubber.Quantities lists them.
func inOrder(readings []snubber.Reading) {
	if len(readings) < 2 {
		return
	}
	order := snubber.Quantities()
	slices.SortStableFunc(readings, func(a, b snubber.Reading) int {
		return slices.Index(order, a.Quantity) - slices.Index(order, b.Quantity)
	})
}
