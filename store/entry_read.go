package store

import (
	"context"
	"crypto/sha256"
	"database/sql"
	"errors"
	"fmt"
	"iter"
	"time"

	"ringbook/snubber"
	"ringbook/snubber/waveform"
)

// entryReader reads entries from one connection, whole rows in the order of their tables. The few names that trials refer to
// are kept, rather than joined to each.
type entryReader struct {
	db          querier
	revisions   map[int64][2]string
	sessions    map[int64]string
	instruments map[int64]string
	points      map[int64]snubber.OperatingPoint
}

func newEntryReader(db querier) *entryReader {
	return &entryReader{db: db, revisions: map[int64][2]string{}, sessions: map[int64]string{}, instruments: map[int64]string{},
		points: map[int64]snubber.OperatingPoint{}}
}

// loggedRow is an entry and its row's number.
type loggedRow struct {
	seq int64
	*entry
}

// rowFault is damage to one row; those after it can be read.
type rowFault struct {
	id, what string
}

func (f *rowFault) Error() string { return f.what }

// rows streams the entries of a kind in rows first to last. An error that is a rowFault is of that row alone; after
// any other the sequence ends.
func (r *entryReader) rows(ctx context.Context, kind string, first, last int64) iter.Seq2[loggedRow, error] {
	switch kind {
	case trialKind:
		return r.trials(ctx, first, last)
	case strikeKind:
		return queried(ctx, r.db, `SELECT k.seq, k.id, ifnull(t.id, ''), k.at, k.because
FROM strike k LEFT JOIN trial t ON t.seq = k.trial WHERE k.seq BETWEEN ? AND ? ORDER BY k.seq`, first, last, scanStrike)
	case decisionKind:
		return queried(ctx, r.db, fmt.Sprintf(selectDecisions, "SELECT seq, at FROM decision WHERE seq BETWEEN ? AND ?", "picked.seq"), first, last, scanLoggedDecision)
	default:
		return queried(ctx, r.db, `SELECT c.seq, c.id, ifnull(b.name, ''), ifnull(v.name, ''), ifnull(c.at, ''), ifnull(c.device_v, 0), ifnull(c.note, '')
FROM correction c LEFT JOIN board b ON b.id = c.board LEFT JOIN revision v ON v.id = c.revision WHERE c.seq BETWEEN ? AND ? ORDER BY c.seq`, first, last, scanCorrection)
	}
}

func queried(ctx context.Context, db querier, query string, first, last int64, scan func(*sql.Rows) (loggedRow, error)) iter.Seq2[loggedRow, error] {
	return func(yield func(loggedRow, error) bool) {
		rows, err := db.QueryContext(ctx, query, first, last)
		if err != nil {
			yield(loggedRow{}, err)
			return
		}
		defer rows.Close()
		for rows.Next() {
			row, err := scan(rows)
			var fault *rowFault
			if !yield(row, err) || err != nil && !errors.As(err, &fault) {
				return
			}
		}
		if err := rows.Err(); err != nil {
			yield(loggedRow{}, err)
		}
	}
}

// logTime reads a time as this logbook writes it.
func logTime(id, text string) (time.Time, error) {
	at, err := time.Parse(timeLayout, text)
	if err != nil {
		return at, &rowFault{id, fmt.Sprintf("its time %s is not one a logbook writes", quote(text))}
	}
	return at, nil
}

func scanStrike(rows *sql.Rows) (row loggedRow, err error) {
	s := &loggedStrike{}
	row.entry = &entry{strike: s}
	var at string
	if err := rows.Scan(&row.seq, &s.id, &s.trial, &at, &s.because); err != nil {
		return row, err
	}
	s.at, err = logTime(s.id, at)
	return row, err
}

func scanCorrection(rows *sql.Rows) (row loggedRow, err error) {
	c := &loggedCorrection{}
	row.entry = &entry{correction: c}
	var at string
	if err := rows.Scan(&row.seq, &c.id, &c.board, &c.revision, &at, &c.deviceV, &c.note); err != nil || at == "" {
		return row, err
	}
	c.at, err = logTime(c.id, at)
	return row, err
}

func scanLoggedDecision(rows *sql.Rows) (row loggedRow, err error) {
	d, seq, err := scanDecision(rows)
	if err != nil && d.ID != "" {
		err = &rowFault{d.ID, err.Error()}
	}
	return loggedRow{seq, &entry{decision: &d}}, err
}

const (
	selectTrialRows = `SELECT seq, id, revision, ifnull(session, 0), ifnull(operating_point, 0), at, logged_at, network,
  ifnull(c, 0), ifnull(c_tol, 0), ifnull(r, 0), ifnull(r_tol, 0), ifnull(esr, 0), ifnull(measured_c, 0), ifnull(measured_c_u, 0),
  ifnull(probe_c, 0), ifnull(part, ''), ifnull(note, '') FROM trial WHERE seq BETWEEN ? AND ? ORDER BY seq`
	selectReadingRows = `SELECT trial, quantity, value, ifnull(u, 0), ifnull(instrument, 0), ifnull(from_waveform, 0)
FROM reading WHERE trial BETWEEN ? AND ? ORDER BY trial, quantity`
	selectRepeatRows   = `SELECT trial, quantity, value FROM reading_repeat WHERE trial BETWEEN ? AND ? ORDER BY trial, quantity, n`
	selectWaveformRows = `SELECT trial, id, start_s, interval_s, ifnull(step_v, 0), samples, encoding, sha256, ifnull(origin, '')
FROM waveform WHERE trial BETWEEN ? AND ? ORDER BY trial, seq`
)

// readingRow is a reading and its instrument's row.
type readingRow struct {
	snubber.Reading
	device int64
}

// trials walks the trials with three more cursors beside them.
func (r *entryReader) trials(ctx context.Context, first, last int64) iter.Seq2[loggedRow, error] {
	return func(yield func(loggedRow, error) bool) {
		fail := func(err error) { yield(loggedRow{}, err) }
		rows, err := r.db.QueryContext(ctx, selectTrialRows, first, last)
		if err != nil {
			fail(err)
			return
		}
		defer rows.Close()
		span := []any{first, last}
		readings, err := openCursor(ctx, r.db, selectReadingRows, span, func(rows *sql.Rows, trial *int64, v *readingRow) error {
			return rows.Scan(trial, &v.Quantity, &v.Value, &v.U, &v.device, &v.FromWaveform)
		})
		if err != nil {
			fail(err)
			return
		}
		defer readings.rows.Close()
		repeats, err := openCursor(ctx, r.db, selectRepeatRows, span, func(rows *sql.Rows, trial *int64, v *readingRow) error {
			return rows.Scan(trial, &v.Quantity, &v.Value)
		})
		if err != nil {
			fail(err)
			return
		}
		defer repeats.rows.Close()
		waveforms, err := openCursor(ctx, r.db, selectWaveformRows, span, func(rows *sql.Rows, trial *int64, p *packed) error {
			var digest []byte
			err := rows.Scan(trial, &p.id, &p.Start, &p.Interval, &p.StepV, &p.samples, &p.encoding, &digest, &p.Origin)
			copy(p.digest[:], digest)
			return err
		})
		if err != nil {
			fail(err)
			return
		}
		defer waveforms.rows.Close()

		for rows.Next() {
			row, refs, fault := scanTrialRow(rows)
			var soft *rowFault
			if fault != nil && !errors.As(fault, &soft) {
				fail(fault)
				return
			}
			t := row.trial
			if fault == nil {
				fault = r.refer(ctx, t, refs)
			}
			for readings.at(row.seq) {
				v := readings.next
				if err := readings.advance(); err != nil {
					fail(err)
					return
				}
				if v.device != 0 && fault == nil {
					v.Instrument, fault = r.instrument(ctx, t.ID, v.device)
				}
				for repeats.at(row.seq) && repeats.next.Quantity == v.Quantity {
					v.Repeats = append(v.Repeats, repeats.next.Value)
					if err := repeats.advance(); err != nil {
						fail(err)
						return
					}
				}
				t.Readings = append(t.Readings, v.Reading)
			}
			for waveforms.at(row.seq) {
				t.waveforms = append(t.waveforms, waveforms.next)
				if err := waveforms.advance(); err != nil {
					fail(err)
					return
				}
			}
			if fault == nil {
				fault = t.checkSamples()
			}
			if fault != nil && !errors.As(fault, &soft) {
				fail(fault)
				return
			}
			if !yield(row, fault) {
				return
			}
			if err := ctx.Err(); err != nil {
				fail(err) // its end may have cut the readings short
				return
			}
		}
		if err := rows.Err(); err != nil {
			fail(err)
		}
	}
}

// trialRefs are the rows a trial refers to; 0 for none.
type trialRefs struct{ revision, session, point int64 }

func scanTrialRow(rows *sql.Rows) (row loggedRow, refs trialRefs, err error) {
	t := &loggedTrial{}
	row.entry = &entry{trial: t}
	n := &t.Network
	var at, logged string
	err = rows.Scan(&row.seq, &t.ID, &refs.revision, &refs.session, &refs.point, &at, &logged, &n.Kind,
		&n.C, &n.CTol, &n.R, &n.RTol, &n.ESR, &n.MeasuredC, &n.MeasuredU, &t.ProbeC, &t.Part, &t.Note)
	if err != nil {
		return row, refs, err
	}
	if t.At, err = logTime(t.ID, at); err != nil {
		return row, refs, err
	}
	t.loggedAt, err = logTime(t.ID, logged)
	return row, refs, err
}

// refer fills in the names behind refs.
func (r *entryReader) refer(ctx context.Context, t *loggedTrial, refs trialRefs) error {
	names, err := known(ctx, r, t.ID, "revision", r.revisions, refs.revision, `SELECT b.name, v.name FROM revision v JOIN board b ON b.id = v.board WHERE v.id = ?`,
		func(rows *sql.Rows, v *[2]string) error { return rows.Scan(&v[0], &v[1]) })
	if err != nil {
		return err
	}
	t.Board, t.Revision = names[0], names[1]
	if refs.session != 0 {
		if t.Session, err = known(ctx, r, t.ID, "session", r.sessions, refs.session, `SELECT name FROM session WHERE id = ?`,
			func(rows *sql.Rows, v *string) error { return rows.Scan(v) }); err != nil {
			return err
		}
	}
	if refs.point != 0 {
		t.Point, err = known(ctx, r, t.ID, "operating point", r.points, refs.point,
			`SELECT ifnull(bus_v, 0), ifnull(current_a, 0), ifnull(switching_hz, 0) FROM operating_point WHERE id = ?`,
			func(rows *sql.Rows, p *snubber.OperatingPoint) error {
				return rows.Scan(&p.BusV, &p.CurrentA, &p.SwitchingHz)
			})
	}
	return err
}

func (r *entryReader) instrument(ctx context.Context, trial string, n int64) (string, error) {
	return known(ctx, r, trial, "instrument", r.instruments, n, `SELECT idn FROM instrument WHERE id = ?`,
		func(rows *sql.Rows, v *string) error { return rows.Scan(v) })
}

// known is what row n of a kind of name holds: remembered or read.
func known[T any](ctx context.Context, r *entryReader, trial, what string, have map[int64]T, n int64, query string, scan func(*sql.Rows, *T) error) (v T, err error) {
	if v, ok := have[n]; ok {
		return v, nil
	}
	rows, err := r.db.QueryContext(ctx, query, n)
	if err != nil {
		return v, err
	}
	defer rows.Close()
	if !rows.Next() {
		if err := rows.Err(); err != nil {
			return v, err
		}
		return v, &rowFault{trial, "the " + what + " it names is not there"}
	}
	if err := scan(rows, &v); err != nil {
		return v, err
	}
	if len(have) >= cacheLimit {
		clear(have)
	}
	have[n] = v
	return v, rows.Close()
}

func (t *loggedTrial) checkSamples() error {
	for i := range t.waveforms {
		if w := &t.waveforms[i]; sha256.Sum256(w.samples) != w.digest {
			return &rowFault{t.ID, "the samples of its waveform " + w.id + " are not those of their SHA-256"}
		}
	}
	return nil
}

// unpacked is whether the samples can be read at all; what is merged or imported is looked at first.
func (p *packed) unpacked() error {
	volts, err := waveform.Unpack(p.samples, p.encoding)
	if err != nil {
		return err
	}
	full := p.Record
	full.Volts = volts
	return full.Check()
}
