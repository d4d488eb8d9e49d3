package store

import (
	"context"
	"database/sql"
	"fmt"
	"math"
	"time"
)

// Board is what is under test.
type Board struct {
	Name      string
	DeviceV   float64 // V: the switch's rated voltage; 0: not stated
	Note      string
	Revisions []Revision // in the order they were made
}

// Revision is one revision of a board, with the trials of it that are in scope.
type Revision struct {
	Board, Name string
	Note        string
	DeviceV     float64   // V: the board's; 0: not stated
	Trials      int       // how many
	First, Last time.Time // when the first and the last of them was read; zero where there are none
}

// AddBoard puts a board on file, with the revisions it names. Of a board that is on file already, it fills in what was
// not stated and adds the revisions that are new; a rating or note that differs from the one on file is an error that
// quotes both, and CorrectBoard is the cure.
func (lb *Logbook) AddBoard(ctx context.Context, b Board) error { return lb.putBoard(ctx, b, false) }

// CorrectBoard puts the rating and the notes b states in the place of those on file. Trials are not touched, and what was
// stated before stays in table correction.
func (lb *Logbook) CorrectBoard(ctx context.Context, b Board) error { return lb.putBoard(ctx, b, true) }

// EnsureRevision puts a board and a revision of it on file, unless they are there.
func (lb *Logbook) EnsureRevision(ctx context.Context, board, revision string) error {
	return lb.AddBoard(ctx, Board{Name: board, Revisions: []Revision{{Name: revision}}})
}

func (lb *Logbook) putBoard(ctx context.Context, b Board, correct bool) error {
	if err := checkBoard(b); err != nil {
		return fmt.Errorf("board %s: %w", quote(b.Name), err)
	}
	return lb.write(ctx, func(w *writer) error {
		about := loggedCorrection{board: b.Name, deviceV: b.DeviceV, note: b.Note}
		if err := w.state(ctx, about, correct); err != nil {
			return err
		}
		for _, r := range b.Revisions {
			if err := w.state(ctx, loggedCorrection{board: b.Name, revision: r.Name, note: r.Note}, correct); err != nil {
				return err
			}
		}
		return nil
	})
}

func checkBoard(b Board) error {
	if b.Name == "" {
		return bad("board", "it is empty; name the board")
	}
	if err := checkName("board", b.Name); err != nil {
		return err
	}
	if !(b.DeviceV >= 0) || math.IsInf(b.DeviceV, 0) {
		return fmt.Errorf("rated %g V; a rating is a positive, finite voltage", b.DeviceV)
	}
	if err := checkText("note", b.Note); err != nil {
		return err
	}
	for _, r := range b.Revisions {
		if r.Name == "" {
			return bad("revision", "it is empty; name the revision")
		}
		if err := checkName("revision", r.Name); err != nil {
			return err
		}
		if err := checkText("note", r.Note); err != nil {
			return err
		}
	}
	return nil
}

// Boards lists every board with its revisions, by name; trials that were struck are not counted.
func (lb *Logbook) Boards(ctx context.Context) ([]Board, error) {
	rows, err := lb.db.QueryContext(ctx, `
SELECT b.name, ifnull(b.device_v, 0), ifnull(b.note, ''), v.name, ifnull(v.note, ''), count(t.seq), min(t.at), max(t.at)
FROM board b LEFT JOIN revision v ON v.board = b.id
LEFT JOIN trial t ON t.revision = v.id AND NOT EXISTS (SELECT 1 FROM strike k WHERE k.trial = t.seq)
GROUP BY b.id, v.id ORDER BY b.name, v.id`)
	if err != nil {
		return nil, explain(lb.path, err)
	}
	defer rows.Close()
	var boards []Board
	for rows.Next() {
		var b Board
		var r Revision
		var name, first, last sql.NullString
		if err := rows.Scan(&b.Name, &b.DeviceV, &b.Note, &name, &r.Note, &r.Trials, &first, &last); err != nil {
			return nil, explain(lb.path, err)
		}
		if n := len(boards); n == 0 || boards[n-1].Name != b.Name {
			boards = append(boards, b)
		}
		if !name.Valid {
			continue
		}
		if err := r.date(first, last); err != nil {
			return nil, explain(lb.path, err)
		}
		r.Board, r.Name, r.DeviceV = b.Name, name.String, b.DeviceV
		here := &boards[len(boards)-1]
		here.Revisions = append(here.Revisions, r)
	}
	return boards, explain(lb.path, rows.Err())
}

// Revisions lists the revisions that have trials in scope, by board and then in the order they were made. The scope's
// Limit is not used.
func (lb *Logbook) Revisions(ctx context.Context, s Scope) ([]Revision, error) {
	where, args := s.where()
	rows, err := lb.db.QueryContext(ctx, `
SELECT b.name, v.name, ifnull(v.note, ''), ifnull(b.device_v, 0), count(*), min(t.at), max(t.at)
FROM trial t JOIN revision v ON v.id = t.revision JOIN board b ON b.id = v.board
WHERE `+where+` GROUP BY b.id, v.id ORDER BY b.name, v.id`, args...)
	if err != nil {
		return nil, explain(lb.path, err)
	}
	defer rows.Close()
	var all []Revision
	for rows.Next() {
		var r Revision
		var first, last sql.NullString
		if err := rows.Scan(&r.Board, &r.Name, &r.Note, &r.DeviceV, &r.Trials, &first, &last); err != nil {
			return nil, explain(lb.path, err)
		}
		if err := r.date(first, last); err != nil {
			return nil, explain(lb.path, err)
		}
		all = append(all, r)
	}
	return all, explain(lb.path, rows.Err())
}

func (r *Revision) date(first, last sql.NullString) (err error) {
	if !first.Valid {
		return nil
	}
	if r.First, err = time.Parse(timeLayout, first.String); err != nil {
		return err
	}
	r.Last, err = time.Parse(timeLayout, last.String)
	return err
}
