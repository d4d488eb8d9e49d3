package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"

	"github.com/google/uuid"
)

// oldLogbooks is the name space (RFC 9562, 5.5) of ids that are made from what an older logbook holds, so that two copies
// of it moved forward apart are the same logbook with the same chain.
var oldLogbooks = uuid.MustParse("5f3c1d5e-6a0b-5e0e-9d1c-52494e474241")

// finish is what a migration to schema does besides its script, in the same transaction.
func finish(ctx context.Context, conn *sql.Conn, schema int) error {
	if schema != 4 {
		return nil
	}
	if err := chainOld(ctx, conn); err != nil {
		return fmt.Errorf("chain what is logged: %w", err)
	}
	return nil
}

// chainOld gives the logbook its id, and chains its trials, strikes and decisions in the order of their tables, and what
// its boards state as corrections without a time.
func chainOld(ctx context.Context, conn *sql.Conn) error {
	id, err := oldID(ctx, conn)
	if err != nil {
		return err
	}
	w := newWriter(conn)
	defer w.closeStatements()
	if _, err := w.insert(ctx, `INSERT INTO logbook (n, id) VALUES (1, ?)`, id); err != nil {
		return err
	}
	if err := stateOld(ctx, w); err != nil {
		return err
	}
	for _, kind := range []string{trialKind, strikeKind, decisionKind} {
		if err := w.chainTable(ctx, kind); err != nil {
			return err
		}
	}
	return w.finish(ctx)
}

// oldID is made of the first trial's id; where there is none, it is new.
func oldID(ctx context.Context, conn *sql.Conn) (string, error) {
	var first string
	err := conn.QueryRowContext(ctx, `SELECT id FROM trial ORDER BY seq LIMIT 1`).Scan(&first)
	if errors.Is(err, sql.ErrNoRows) {
		ids, err := newIDs(1)
		if err != nil {
			return "", err
		}
		return ids[0], nil
	}
	return uuid.NewSHA1(oldLogbooks, []byte(first)).String(), err
}

// stateOld makes a correction of each board and revision on file.
func stateOld(ctx context.Context, w *writer) error {
	rows, err := w.conn.QueryContext(ctx, `SELECT name, '', ifnull(device_v, 0), ifnull(note, ''), id, 0 FROM board
UNION ALL SELECT b.name, v.name, 0, ifnull(v.note, ''), b.id, v.id FROM revision v JOIN board b ON b.id = v.board ORDER BY 5, 6`)
	if err != nil {
		return err
	}
	defer rows.Close()
	var all []loggedCorrection
	for rows.Next() {
		var c loggedCorrection
		var ignored int64
		if err := rows.Scan(&c.board, &c.revision, &c.deviceV, &c.note, &ignored, &ignored); err != nil {
			return err
		}
		e := entry{correction: &c}
		c.id = uuid.NewSHA1(oldLogbooks, e.text(nil)).String()
		all = append(all, c)
	}
	if err := errors.Join(rows.Err(), rows.Close()); err != nil {
		return err
	}
	for i := range all {
		if err := w.addCorrection(ctx, &all[i], nil); err != nil {
			return err
		}
	}
	return nil
}

// chainTable chains every row of a kind's table.
func (w *writer) chainTable(ctx context.Context, kind string) error {
	var last, n int64
	if err := w.conn.QueryRowContext(ctx, `SELECT ifnull(max(seq), 0) FROM `+kind).Scan(&last); err != nil {
		return err
	}
	r := newEntryReader(w.conn)
	for row, err := range r.rows(ctx, kind, 1, last) {
		if err != nil {
			return err
		}
		if err := w.chain(ctx, row.entry, row.seq, nil); err != nil {
			return err
		}
		if n++; kind == trialKind {
			if err := w.index(ctx, row.seq, len(row.trial.Part)+len(row.trial.Note)); err != nil {
				return err
			}
		}
	}
	return nil
}
