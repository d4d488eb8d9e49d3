package store

import (
	"context"

	"ringbook/snubber"
)

// The rows that trials refer to by name. Each is found, or made when new.

type revisionKey struct {
	board int64
	name  string
}

type pointKey struct{ bus, current, switching float64 }

func (w *writer) board(ctx context.Context, name string) (int64, error) {
	return number(ctx, w, w.boards, name,
		`SELECT id FROM board WHERE name = ?`, `INSERT INTO board (name) VALUES (?)`, name)
}

func (w *writer) revision(ctx context.Context, board, name string) (int64, error) {
	b, err := w.board(ctx, board)
	if err != nil {
		return 0, err
	}
	return number(ctx, w, w.revs, revisionKey{b, name},
		`SELECT id FROM revision WHERE board = ? AND name = ?`, `INSERT INTO revision (board, name) VALUES (?, ?)`, b, name)
}

func (w *writer) session(ctx context.Context, name string) (any, error) {
	if name == "" {
		return nil, nil
	}
	return number(ctx, w, w.sessions, name,
		`SELECT id FROM session WHERE name = ?`, `INSERT INTO session (name) VALUES (?)`, name)
}

func (w *writer) instrument(ctx context.Context, idn string) (any, error) {
	if idn == "" {
		return nil, nil
	}
	return number(ctx, w, w.devices, idn,
		`SELECT id FROM instrument WHERE idn = ?`, `INSERT INTO instrument (idn) VALUES (?)`, idn)
}

func (w *writer) point(ctx context.Context, p snubber.OperatingPoint) (any, error) {
	if p == (snubber.OperatingPoint{}) {
		return nil, nil
	}
	// The ifnull terms are those of the unique index operating_point_once.
	return number(ctx, w, w.points, pointKey{p.BusV, p.CurrentA, p.SwitchingHz},
		`SELECT id FROM operating_point WHERE ifnull(bus_v, 0) = ifnull(?, 0)
  AND ifnull(current_a, 0) = ifnull(?, 0) AND ifnull(switching_hz, 0) = ifnull(?, 0)`,
		`INSERT INTO operating_point (bus_v, current_a, switching_hz) VALUES (?, ?, ?)`,
		orNull(p.BusV), orNull(p.CurrentA), orNull(p.SwitchingHz))
}

func (w *writer) logbook(ctx context.Context, id string) (int64, error) {
	return number(ctx, w, w.logbooks, id, `SELECT n FROM logbook WHERE id = ?`, `INSERT INTO logbook (id) VALUES (?)`, id)
}
