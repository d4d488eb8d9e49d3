package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"iter"
)

// linkRow is a row of the chain.
type linkRow struct {
	seq    int64
	kind   string
	row    int64
	link   link
	origin *place // where it was first logged; nil: here
}

const selectLinks = `SELECT c.seq, c.kind, c.row, c.link, ifnull(o.chain, 0), ifnull(l.id, ''), ifnull(o.seq, 0), o.previous, o.link
FROM chain c LEFT JOIN origin o ON o.chain = c.seq LEFT JOIN logbook l ON l.n = o.logbook
WHERE c.seq BETWEEN ? AND ? ORDER BY c.seq`

// links are the rows of the chain from first to last.
func links(ctx context.Context, db querier, first, last int64) ([]linkRow, error) {
	rows, err := db.QueryContext(ctx, selectLinks, first, last)
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	all := make([]linkRow, 0, last-first+1)
	for rows.Next() {
		var l linkRow
		var o place
		var is int64
		var own, previous, there sql.RawBytes
		if err := rows.Scan(&l.seq, &l.kind, &l.row, &own, &is, &o.logbook, &o.seq, &previous, &there); err != nil {
			return nil, err
		}
		copy(l.link[:], own)
		if is != 0 {
			copy(o.previous[:], previous)
			copy(o.link[:], there)
			l.origin = &o
		}
		all = append(all, l)
	}
	return all, rows.Err()
}

// previousLink is the link that the entry first follows.
func previousLink(ctx context.Context, db querier, logbook string, first int64) (link, error) {
	if first == 1 {
		return firstLink(logbook), nil
	}
	before, err := links(ctx, db, first-1, first-1)
	if err != nil || len(before) == 0 {
		return link{}, err // the gap is found where it is
	}
	return before[0].link, nil
}

// chained is an entry read together with its link.
type chained struct {
	linkRow
	*entry        // nil where the row is not there
	fault  string // what is wrong with the row; "" where nothing is
}

// span is the rows of one kind that a part of the chain stands for.
type span struct {
	kind        string
	at          int64 // the first entry's place in the chain
	first, last int64
}

// spans are the rows that part stands for, of each kind.
func spans(part []linkRow) []span {
	var all []span
	for _, l := range part {
		i := 0
		for i < len(all) && all[i].kind != l.kind {
			i++
		}
		if i == len(all) {
			all = append(all, span{l.kind, l.seq, l.row, l.row})
		}
		all[i].first, all[i].last = min(all[i].first, l.row), max(all[i].last, l.row)
	}
	return all
}

// walk reads the entries of part, a part of the chain, in its order, one at a time. loose, unless nil, is told of rows among
// them that the chain does not name. Within part the rows of a kind are in order, for entries are chained as they are logged.
func (r *entryReader) walk(ctx context.Context, part []linkRow, loose func(kind string, row loggedRow), do func(chained) error) error {
	type source struct {
		next func() (loggedRow, error, bool)
		row  loggedRow
		err  error
		more bool
	}
	sources := map[string]*source{}
	for _, s := range spans(part) {
		if s.last-s.first > 64*auditChunk {
			return fmt.Errorf("entry %d names a %s far from the others: %w", s.at, s.kind, ErrDamaged)
		}
		next, stop := iter.Pull2(r.rows(ctx, s.kind, s.first, s.last))
		defer stop()
		x := &source{next: next}
		x.row, x.err, x.more = next()
		sources[s.kind] = x
	}
	for _, l := range part {
		x := sources[l.kind]
		for x.more && hard(x.err) == nil && x.row.seq < l.row {
			if loose != nil {
				loose(l.kind, x.row)
			}
			x.row, x.err, x.more = x.next()
		}
		if x.more {
			if err := hard(x.err); err != nil {
				return err
			}
		}
		c := chained{linkRow: l}
		if x.more && x.row.seq == l.row {
			c.entry = x.row.entry
			if x.err != nil {
				c.fault = x.err.Error()
			}
			x.row, x.err, x.more = x.next()
		}
		if err := do(c); err != nil {
			return err
		}
	}
	return nil
}

// hard is err unless it is of one row alone.
func hard(err error) error {
	var fault *rowFault
	if errors.As(err, &fault) {
		return nil
	}
	return err
}
