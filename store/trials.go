package store

import (
	"context"
	"database/sql"
	"fmt"
	"iter"
	"time"

	"ringbook/snubber"
)

// Trials streams the trials in scope in the order they were read, one at a time in memory, all from one state of the
// logbook: a write in the meantime is not seen. Readings come in the order of snubber.Quantities. After an error the
// sequence ends.
func (lb *Logbook) Trials(ctx context.Context, s Scope) iter.Seq2[snubber.Trial, error] {
	picked, args := s.picked()
	return lb.stream(ctx, picked, args)
}

// stream walks the trials of picked, a query for (seq, at), with three cursors side by side: trials, readings, repeats.
func (lb *Logbook) stream(ctx context.Context, picked string, args []any) iter.Seq2[snubber.Trial, error] {
	return func(yield func(snubber.Trial, error) bool) {
		fail := func(err error) { yield(snubber.Trial{}, fmt.Errorf("read trials: %w", explain(lb.path, err))) }
		tx, err := lb.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
		if err != nil {
			fail(err)
			return
		}
		defer tx.Rollback() // it only read
		lb.streamFrom(ctx, tx, picked, inTime, args, yield)
	}
}

// inTime is the order of time, of the table picked that streamFrom is given.
const inTime = "picked.at, picked.seq"

// streamFrom walks the trials of picked, a query for (seq, at), in an order of these that no two trials share a place in. It
// says whether more may follow: no error, and nobody has heard enough.
func (lb *Logbook) streamFrom(ctx context.Context, tx *sql.Tx, picked, order string, args []any, yield func(snubber.Trial, error) bool) (more bool) {
	fail := func(err error) bool {
		yield(snubber.Trial{}, fmt.Errorf("read trials: %w", explain(lb.path, err)))
		return false
	}
	trials, err := tx.QueryContext(ctx, fmt.Sprintf(selectTrials, picked, order), args...)
	if err != nil {
		return fail(err)
	}
	defer trials.Close()
	readings, err := openReadings(ctx, tx, picked, order, args)
	if err != nil {
		return fail(err)
	}
	defer readings.close()
	for trials.Next() {
		t, seq, err := scanTrial(trials)
		if err == nil {
			t.Readings, err = readings.of(seq)
		}
		if err == nil {
			err = ctx.Err() // its end may have cut the readings short
		}
		if err != nil {
			return fail(err)
		}
		if !yield(t, nil) {
			return false
		}
	}
	if err := trials.Err(); err != nil {
		return fail(err)
	}
	return true
}

const selectTrials = `
SELECT t.seq, t.id, b.name, v.name, t.at, ifnull(s.name, ''), t.network,
  ifnull(t.c, 0), ifnull(t.c_tol, 0), ifnull(t.r, 0), ifnull(t.r_tol, 0), ifnull(t.esr, 0),
  ifnull(t.measured_c, 0), ifnull(t.measured_c_u, 0), ifnull(t.probe_c, 0),
  ifnull(p.bus_v, 0), ifnull(p.current_a, 0), ifnull(p.switching_hz, 0), ifnull(t.part, ''), ifnull(t.note, ''),
  ifnull((SELECT because FROM strike k WHERE k.trial = t.seq ORDER BY k.at, k.id LIMIT 1), '')
FROM (%s) picked CROSS JOIN trial t ON t.seq = picked.seq
JOIN revision v ON v.id = t.revision JOIN board b ON b.id = v.board
LEFT JOIN session s ON s.id = t.session LEFT JOIN operating_point p ON p.id = t.operating_point
ORDER BY %s`

func scanTrial(rows *sql.Rows) (t snubber.Trial, seq int64, err error) {
	var at string
	n, p := &t.Network, &t.Point
	err = rows.Scan(&seq, &t.ID, &t.Board, &t.Revision, &at, &t.Session, &n.Kind,
		&n.C, &n.CTol, &n.R, &n.RTol, &n.ESR, &n.MeasuredC, &n.MeasuredU, &t.ProbeC,
		&p.BusV, &p.CurrentA, &p.SwitchingHz, &t.Part, &t.Note, &t.Struck)
	if err != nil {
		return t, seq, err
	}
	if t.At, err = time.Parse(timeLayout, at); err != nil {
		return t, seq, fmt.Errorf("trial %s: its time %s is not one this logbook writes", t.ID, quote(at))
	}
	return t, seq, nil
}
