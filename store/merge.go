package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"path/filepath"
)

// Merged is how many entries of another logbook were added, and how many were here already.
type Merged struct {
	Trials, Strikes, Decisions, Corrections int
	Known                                   int
}

// Added is how many entries were added.
func (m Merged) Added() int { return m.Trials + m.Strikes + m.Decisions + m.Corrections }

func (m *Merged) count(kind string) {
	switch kind {
	case trialKind:
		m.Trials++
	case strikeKind:
		m.Strikes++
	case decisionKind:
		m.Decisions++
	default:
		m.Corrections++
	}
}

// Merge adds every trial, strike, decision and correction of the logbook at other that is not here yet, in one transaction:
// a process killed meanwhile leaves this logbook as it was, and the other is only read. An entry is known by its id, so that
// merging again adds nothing, and logbooks that have merged each other hold the same in whatever order they did. Each
// entry keeps its place in the chain of the logbook where it was first logged. Of what two logbooks state of one board, the
// latest stands.
//
// Each entry is audited as it is read. One that is not what was logged, or that is here with another text under the same
// id, is an error of kind ErrDamaged that names it, and nothing is merged. Errors are also those of OpenReadOnly. A logbook of an
// older schema is read through a copy, in the folder for temporary files, that is brought up to date.
//
// progress, unless nil, is told how many entries of all have been looked at.
func (lb *Logbook) Merge(ctx context.Context, other string, progress func(done, all int64)) (m Merged, err error) {
	defer func() {
		if err != nil {
			m, err = Merged{}, fmt.Errorf("merge %s: %w", other, err)
		}
	}()
	src, done, err := openSource(ctx, other)
	if err != nil {
		return m, err
	}
	defer func() { err = errors.Join(err, done()) }()
	if same(lb.path, src.path) {
		return m, errors.New("it is this logbook itself; name another")
	}
	tx, err := src.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
	if err != nil {
		return m, explain(src.path, err)
	}
	defer tx.Rollback() // it only read
	unwatched := context.WithoutCancel(ctx)
	err = lb.write(ctx, func(w *writer) error {
		return src.entries(ctx, tx, progress, func(e *entry, origin place) error {
			return w.take(unwatched, e, origin, &m, func(what string) error { return src.damaged(e, what) })
		})
	})
	return m, err
}

// entries hands every entry in the order of the chain to do, audited, with its place in the chain it came from. Errors of do
// come back as they are, those of reading as Faults of this logbook.
func (lb *Logbook) entries(ctx context.Context, tx *sql.Tx, progress func(done, all int64), do func(e *entry, origin place) error) error {
	end, err := lastPlace(ctx, tx)
	if err != nil {
		return explain(lb.path, err)
	}
	var theirs error // of do
	var text []byte
	previous := firstLink(end.logbook)
	r := newEntryReader(tx)
	for first := int64(1); first <= end.seq; first += auditChunk {
		last := min(first+auditChunk-1, end.seq)
		part, err := links(ctx, tx, first, last)
		if err != nil {
			return explain(lb.path, err)
		}
		if len(part) != int(last-first+1) {
			return lb.damaged(nil, fmt.Sprintf("its chain has a gap between entries %d and %d", first, last))
		}
		err = r.walk(ctx, part, nil, func(c chained) error {
			p := place{end.logbook, c.seq, previous, c.link}
			previous = c.link
			if c.entry == nil {
				return lb.damaged(nil, fmt.Sprintf("entry %d of its chain, a %s, is missing", c.seq, c.linkRow.kind))
			}
			if c.fault != "" {
				return lb.damaged(c.entry, c.fault)
			}
			text = c.text(text[:0])
			origin := p
			if c.origin != nil {
				origin = *c.origin
			}
			if p.seal(text, c.origin) != c.link || c.origin != nil && origin.seal(text, nil) != origin.link {
				return lb.damaged(c.entry, "it is not what was logged")
			}
			theirs = do(c.entry, origin)
			return theirs
		})
		switch {
		case theirs != nil:
			return theirs
		case err != nil && ctx.Err() != nil:
			return ctx.Err()
		case errors.Is(err, ErrDamaged):
			var fault *Fault
			if errors.As(err, &fault) {
				return err
			}
			return lb.damaged(nil, err.Error())
		case err != nil:
			return explain(lb.path, err)
		}
		if err := ctx.Err(); err != nil {
			return err
		}
		if progress != nil {
			progress(last, end.seq)
		}
	}
	return nil
}

// damaged is the Fault of a logbook whose entry e, unless nil, is wrong.
func (lb *Logbook) damaged(e *entry, what string) error {
	if e != nil {
		what = e.kind() + " " + e.id() + ": " + what
	}
	return &Fault{Path: lb.path, Kind: ErrDamaged, What: "the file is damaged (" + what + ")",
		Cure: "audit it to see all that is wrong, and take it from a backup"}
}

// take adds e unless it is here. fault makes the error of one that cannot be.
func (w *writer) take(ctx context.Context, e *entry, origin place, m *Merged, fault func(what string) error) error {
	here, err := w.has(ctx, e, &origin)
	if err != nil {
		return err
	}
	switch here {
	case theSame:
		m.Known++
		return nil
	case another:
		return fault("this logbook has it with another text; audit both")
	}
	if err := e.check(); err != nil {
		return fault(err.Error())
	}
	switch {
	case e.trial != nil:
		_, err = w.addTrial(ctx, e.trial, &origin)
	case e.strike != nil:
		var trial int64
		err = w.conn.QueryRowContext(ctx, `SELECT seq FROM trial WHERE id = ?`, e.strike.trial).Scan(&trial)
		if errors.Is(err, sql.ErrNoRows) {
			return fault("it strikes trial " + quote(e.strike.trial) + ", which is not there")
		}
		if err == nil {
			err = w.addStrike(ctx, trial, e.strike, &origin)
		}
	case e.decision != nil:
		if err = w.addDecision(ctx, e.decision, &origin); errors.Is(err, ErrNoTrial) {
			return fault(err.Error())
		}
	default:
		err = w.addCorrection(ctx, e.correction, &origin)
	}
	if err != nil {
		return err
	}
	m.count(e.kind())
	return nil
}

// presence is whether an entry is in a logbook.
type presence int

const (
	absent presence = iota
	theSame
	another // under the same id
)

// has looks for e: by its place in the chain it came from, which says all where the link there is the same; else by its id.
func (w *writer) has(ctx context.Context, e *entry, origin *place) (presence, error) {
	if w.last.logbook == "" {
		var err error
		if w.last, err = lastPlace(ctx, w.conn); err != nil {
			return absent, err
		}
	}
	query, args := `SELECT count(*) FROM chain WHERE seq = ? AND link = ?`, []any{origin.seq, origin.link[:]}
	if origin.logbook != w.last.logbook {
		n, err := w.logbook(ctx, origin.logbook)
		if err != nil {
			return absent, err
		}
		query, args = `SELECT count(*) FROM origin WHERE logbook = ? AND seq = ? AND link = ?`, []any{n, origin.seq, origin.link[:]}
	}
	s, err := w.stmt(ctx, query)
	if err != nil {
		return absent, err
	}
	var n int
	if err := s.QueryRowContext(ctx, args...).Scan(&n); err != nil || n > 0 {
		return theSame, err
	}
	if s, err = w.stmt(ctx, `SELECT seq FROM `+e.kind()+` WHERE id = ?`); err != nil {
		return absent, err
	}
	var row int64
	err = s.QueryRowContext(ctx, e.id()).Scan(&row)
	if errors.Is(err, sql.ErrNoRows) {
		return absent, nil
	}
	if err != nil {
		return absent, err
	}
	for own, err := range newEntryReader(w.conn).rows(ctx, e.kind(), row, row) {
		if hard(err) != nil {
			return absent, err
		}
		if err == nil && string(own.text(nil)) == string(e.text(nil)) {
			return theSame, nil
		}
	}
	return another, nil
}

// openSource opens a logbook to read its chain, and gives what to call when done with it.
func openSource(ctx context.Context, path string) (_ *Logbook, done func() error, err error) {
	src, err := OpenReadOnly(ctx, path)
	if err != nil {
		return nil, nil, err
	}
	schema, err := schemaOf(ctx, src.db)
	if err != nil || schema >= 4 {
		if err != nil {
			return nil, nil, errors.Join(explain(path, err), src.Close())
		}
		return src, src.Close, nil
	}
	defer func() { err = errors.Join(err, src.Close()) }()
	folder, err := os.MkdirTemp("", "ringbook-*")
	if err != nil {
		return nil, nil, err
	}
	copied := filepath.Join(folder, "older.db")
	if err := src.copyTo(ctx, copied); err != nil {
		return nil, nil, errors.Join(err, os.RemoveAll(folder))
	}
	lb, err := Open(ctx, copied)
	if err != nil {
		return nil, nil, errors.Join(err, os.RemoveAll(folder))
	}
	return lb, func() error { return errors.Join(lb.Close(), os.RemoveAll(folder)) }, nil
}

func same(a, b string) bool {
	x, errX := os.Stat(a)
	y, errY := os.Stat(b)
	return errX == nil && errY == nil && os.SameFile(x, y)
}
