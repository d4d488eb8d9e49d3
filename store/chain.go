package store

import (
	"bytes"
	"context"
	"crypto/sha256"
	"database/sql"
	"encoding/hex"
	"errors"
	"fmt"
	"strconv"
	"strings"

	"modernc.org/sqlite"
	sqlite3 "modernc.org/sqlite/lib"
)

// link seals an entry together with all entries before it.
type link [sha256.Size]byte

// place is where an entry stands in the chain of a logbook.
type place struct {
	logbook  string // its id
	seq      int64  // 1 for the first entry
	previous link   // the link of the entry before; for the first, firstLink
	link     link
}

// seal is the link of an entry with the canonical text at p. origin, of an entry that was merged, is its place in the
// chain it came from; there it had the same text and no origin. The text hashed is
//
//	ringbook chain 1
//	logbook ID
//	entry SEQ
//	previous LINK
//	(the entry's canonical text)
//	origin LOGBOOK SEQ LINK
//
// with links in lower-case hexadecimal and the last line where there is an origin. It never changes.
func (p *place) seal(text []byte, origin *place) link {
	var room [256]byte
	b := append(room[:0], "ringbook chain 1\nlogbook "...)
	b = append(append(b, p.logbook...), "\nentry "...)
	b = append(strconv.AppendInt(b, p.seq, 10), "\nprevious "...)
	b = append(hexadecimal(b, p.previous[:]), '\n')
	h := sha256.New()
	h.Write(b) // a hash takes every write
	h.Write(text)
	if origin != nil {
		b = append(append(b[:0], "origin "...), origin.logbook...)
		b = strconv.AppendInt(append(b, ' '), origin.seq, 10)
		h.Write(append(hexadecimal(append(b, ' '), origin.link[:]), '\n'))
	}
	var l link
	h.Sum(l[:0])
	return l
}

// firstLink is the link that the first entry of a logbook follows.
func firstLink(logbook string) link {
	return sha256.Sum256([]byte("ringbook chain 1\nlogbook " + logbook + "\n"))
}

func hexadecimal(b, raw []byte) []byte { return hex.AppendEncode(b, raw) }

const (
	insertChain  = `INSERT INTO chain (seq, kind, row, link) VALUES (?, ?, ?, ?)`
	insertOrigin = `INSERT INTO origin (chain, logbook, seq, previous, link) VALUES (?, ?, ?, ?, ?)`
	selectLast   = `SELECT l.id, ifnull(c.seq, 0), c.link FROM logbook l LEFT JOIN chain c
  ON c.seq = (SELECT max(seq) FROM chain) WHERE l.n = 1`

	chainRows = 32 // written by one statement in a long transaction
)

// chain appends to the chain the entry e, which is row of its table.
func (w *writer) chain(ctx context.Context, e *entry, row int64, origin *place) error {
	w.text = e.text(w.text[:0])
	if w.chained > 0 {
		if err := w.seal(ctx, e, row, origin); err != nil || len(w.links) < 4*chainRows {
			return err
		}
		return w.flushChain(ctx)
	}
	// The end of the chain as this connection left it is most often still its end. Where another program has added to it, the
	// place is taken, and the end is looked up; entries are never removed, so it cannot have changed in another way.
	remembered := w.last
	if remembered.logbook != "" {
		err := w.sealAtOnce(ctx, e, row, origin)
		var lite *sqlite.Error
		if err == nil || !errors.As(err, &lite) || lite.Code()&0xff != sqlite3.SQLITE_CONSTRAINT {
			return err
		}
		w.links, w.origins = w.links[:0], w.origins[:0]
	}
	var err error
	if w.last, err = lastPlace(ctx, w.conn); err != nil {
		return err
	}
	return w.sealAtOnce(ctx, e, row, origin)
}

func (w *writer) sealAtOnce(ctx context.Context, e *entry, row int64, origin *place) error {
	if err := w.seal(ctx, e, row, origin); err != nil {
		return err
	}
	return w.flushChain(ctx)
}

// seal makes the link of e, whose text is in w.text, and keeps its row to be written.
func (w *writer) seal(ctx context.Context, e *entry, row int64, origin *place) error {
	p := place{logbook: w.last.logbook, seq: w.last.seq + 1, previous: w.last.link}
	p.link = p.seal(w.text, origin)
	w.last = p
	w.links = append(w.links, p.seq, e.kind(), row, bytes.Clone(p.link[:]))
	if origin != nil {
		n, err := w.logbook(ctx, origin.logbook)
		if err != nil {
			return err
		}
		w.origins = append(w.origins, p.seq, n, origin.seq, bytes.Clone(origin.previous[:]), bytes.Clone(origin.link[:]))
	}
	return nil
}

// flushChain writes the rows kept.
func (w *writer) flushChain(ctx context.Context) error {
	if n := len(w.links) / 4; n > 0 {
		if _, err := w.insert(ctx, insertChain+strings.Repeat(", (?, ?, ?, ?)", n-1), w.links...); err != nil {
			return err
		}
		w.chained += n
	}
	if n := len(w.origins) / 5; n > 0 {
		if _, err := w.insert(ctx, insertOrigin+strings.Repeat(", (?, ?, ?, ?, ?)", n-1), w.origins...); err != nil {
			return err
		}
	}
	w.links, w.origins = w.links[:0], w.origins[:0]
	return nil
}

func lastPlace(ctx context.Context, q querier) (place, error) {
	rows, err := q.QueryContext(ctx, selectLast)
	if err != nil {
		return place{}, err
	}
	defer rows.Close()
	var p place
	if !rows.Next() {
		return p, errors.Join(rows.Err(), fmt.Errorf("it has no id of its own: %w", ErrDamaged))
	}
	var raw sql.RawBytes
	if err := rows.Scan(&p.logbook, &p.seq, &raw); err != nil {
		return p, err
	}
	if p.seq == 0 {
		p.link = firstLink(p.logbook)
	} else {
		copy(p.link[:], raw)
	}
	return p, rows.Close()
}
