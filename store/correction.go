package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"time"
)

const (
	selectBoard    = `SELECT device_v, note FROM board WHERE name = ?`
	selectRevision = `SELECT NULL, v.note FROM revision v JOIN board b ON b.id = v.board WHERE b.name = ? AND v.name = ?`

	insertCorrection = `INSERT INTO correction (id, board, revision, at, device_v, note) VALUES (?, ?, ?, ?, ?, ?)`
	lastCorrection   = `SELECT ifnull(max(c.at), '') FROM correction c JOIN board b ON b.id = c.board WHERE b.name = ?`

	// What stands is what was stated last, in whichever file it was.
	statedVolts   = `(SELECT c.device_v FROM correction c WHERE c.board = b.id AND c.revision IS NULL AND c.device_v IS NOT NULL ORDER BY c.at DESC, c.id DESC LIMIT 1)`
	statedNote    = `(SELECT c.note FROM correction c WHERE c.board = b.id AND c.revision IS NULL AND c.note IS NOT NULL ORDER BY c.at DESC, c.id DESC LIMIT 1)`
	statedRevNote = `(SELECT c.note FROM correction c WHERE c.board = v.board AND c.revision = v.id AND c.note IS NOT NULL ORDER BY c.at DESC, c.id DESC LIMIT 1)`

	settleBoard    = `UPDATE board AS b SET device_v = ` + statedVolts + `, note = ` + statedNote + ` WHERE b.id = ?`
	settleRevision = `UPDATE revision AS v SET note = ` + statedRevNote + ` WHERE v.id = ?`
)

// state puts what c states on file, unless it is there. What differs from what is on file is an error, or a correction.
func (w *writer) state(ctx context.Context, c loggedCorrection, correct bool) error {
	var volts sql.NullFloat64
	var note sql.NullString
	query, args, what := selectBoard, []any{c.board}, "board "+quote(c.board)
	if c.revision != "" {
		query, args, what = selectRevision, append(args, c.revision), what+", revision "+quote(c.revision)
	}
	err := w.conn.QueryRowContext(ctx, query, args...).Scan(&volts, &note)
	fresh := errors.Is(err, sql.ErrNoRows)
	switch {
	case err != nil && !fresh:
		return err
	case correct:
	case c.deviceV != 0 && volts.Valid && volts.Float64 != c.deviceV:
		return fmt.Errorf("%s is on file with a device rated %g V, not %g V; correct the board if that was wrong, or give another device's board another name",
			what, volts.Float64, c.deviceV)
	case c.note != "" && note.Valid && note.String != c.note:
		return fmt.Errorf("%s is on file with the note %s, not %s; correct the board if that was wrong", what, quote(note.String), quote(c.note))
	}
	if c.deviceV == volts.Float64 {
		c.deviceV = 0
	}
	if c.note == note.String {
		c.note = ""
	}
	if !fresh && c.deviceV == 0 && c.note == "" {
		return nil // all of it is on file
	}
	ids, err := newIDs(1)
	if err != nil {
		return err
	}
	c.id = ids[0]
	if c.at, err = w.after(ctx, c.board); err != nil {
		return err
	}
	return w.addCorrection(ctx, &c, nil)
}

// after is now, or later than whatever was stated of the board before: a clock that was set back must not make a correction
// come before what it corrects.
func (w *writer) after(ctx context.Context, board string) (time.Time, error) {
	now := time.Now().UTC()
	var text string
	if err := w.conn.QueryRowContext(ctx, lastCorrection, board).Scan(&text); err != nil || text == "" {
		return now, err
	}
	last, err := time.Parse(timeLayout, text)
	if err != nil {
		return now, err
	}
	if !now.After(last) {
		now = last.Add(time.Nanosecond)
	}
	return now, nil
}

// addCorrection writes a correction's row and its entry in the chain, and settles what stands.
func (w *writer) addCorrection(ctx context.Context, c *loggedCorrection, origin *place) error {
	board, err := w.board(ctx, c.board)
	if err != nil {
		return err
	}
	var revision, at any
	if c.revision != "" {
		if revision, err = w.revision(ctx, c.board, c.revision); err != nil {
			return err
		}
	}
	if !c.at.IsZero() {
		at = timeText(c.at)
	}
	seq, err := w.insert(ctx, insertCorrection, c.id, board, revision, at, orNull(c.deviceV), orNull(c.note))
	if err != nil {
		return err
	}
	if c.revision == "" {
		_, err = w.insert(ctx, settleBoard, board)
	} else {
		_, err = w.insert(ctx, settleRevision, revision)
	}
	if err != nil {
		return err
	}
	return w.chain(ctx, &entry{correction: c}, seq, origin)
}
