package store

import (
	"context"
	"database/sql"
	"encoding/json"
	"errors"
	"fmt"
	"strings"
)

// wanted is a part of what is searched for: phrases that must be in a trial's own words, or one phrase that may be in a name
// instead.
type wanted struct {
	match       string // FTS5's query
	revisions   []int64
	instruments []int64
	recent      []int64 // trials that match, of those not indexed yet
}

// seek finds out what the phrases can be found in. Trials after indexed are not in the index, and are looked at as they are.
func seek(ctx context.Context, tx *sql.Tx, phrases []string, indexed int64) ([]*wanted, error) {
	var all []*wanted
	var texts []string // phrases that no name has, which FTS5 intersects by itself
	for _, p := range phrases {
		w := &wanted{match: p}
		if err := w.names(ctx, tx); err != nil {
			return nil, err
		}
		if w.revisions == nil && w.instruments == nil {
			texts = append(texts, p)
		} else {
			all = append(all, w)
		}
	}
	if texts != nil {
		all = append([]*wanted{{match: strings.Join(texts, " AND ")}}, all...)
	}
	return all, lookAtRecent(ctx, tx, all, indexed)
}

// names finds the revisions and instruments whose name, or whose board's name, has the phrase.
func (w *wanted) names(ctx context.Context, tx *sql.Tx) error {
	found, err := numbers(ctx, tx, `SELECT rowid FROM name_word WHERE name_word MATCH ?`, w.match)
	if err != nil {
		return err
	}
	var boards []int64
	for _, n := range found {
		switch n % 4 {
		case 0:
			boards = append(boards, n/4)
		case 1:
			w.revisions = append(w.revisions, n/4)
		case 2:
			w.instruments = append(w.instruments, n/4)
		}
	}
	if boards == nil {
		return nil
	}
	of, err := numbers(ctx, tx, `SELECT id FROM revision WHERE board IN (SELECT value FROM json_each(?))`, list(boards))
	w.revisions = append(w.revisions, of...)
	return err
}

// condition is what w asks of trial t, where the rows in question are first to last. A phrase that names may have is looked for
// in each of these (+ keeps SQLite from going through all trials of a revision); one that is in the trials' own words leads to
// the trials that have it. What is asked of their readings is looked at on the way there, before the trial itself: of a narrow
// range, few are left.
func (w *wanted) condition(first, last int64, readings []readRange) (string, []any) {
	named := w.revisions != nil || w.instruments != nil
	where, args := "t.seq IN (SELECT w.rowid FROM trial_word w", []any(nil)
	if !named {
		for i, r := range readings {
			x := fmt.Sprintf("x%d", i)
			in, bounds := r.in(x + ".value")
			where += fmt.Sprintf(" CROSS JOIN reading %[1]s ON %[1]s.trial = w.rowid AND %[1]s.quantity = '%[2]s' AND %[3]s", x, r.quantity, in)
			args = append(args, bounds...)
		}
	}
	where, args = where+" WHERE trial_word MATCH ? AND w.rowid BETWEEN ? AND ?", append(args, w.match, first, last)
	if w.recent != nil {
		where, args = where+" UNION ALL SELECT value FROM json_each(?)", append(args, list(w.recent))
	}
	where += ")"
	if !named {
		return where, args
	}
	where = "+" + where
	if w.revisions != nil {
		where, args = where+" OR +t.revision IN (SELECT value FROM json_each(?))", append(args, list(w.revisions))
	}
	if w.instruments != nil {
		where, args = where+" OR EXISTS (SELECT 1 FROM reading x WHERE x.trial = t.seq AND x.instrument IN (SELECT value FROM json_each(?)))", append(args, list(w.instruments))
	}
	return "(" + where + ")", args
}

// lookAtRecent matches the trials after indexed. They go into an index of their own in memory, so that the same tokenizer
// judges them.
func lookAtRecent(ctx context.Context, tx *sql.Tx, all []*wanted, indexed int64) (err error) {
	if len(all) == 0 {
		return nil
	}
	rows, err := tx.QueryContext(ctx, `SELECT seq, ifnull(part, ''), ifnull(note, '') FROM trial
WHERE seq > ? AND (part IS NOT NULL OR note IS NOT NULL)`, indexed)
	if err != nil {
		return err
	}
	defer rows.Close()
	if !rows.Next() {
		return rows.Err()
	}
	db, err := sql.Open("sqlite", ":memory:")
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, db.Close()) }()
	conn, err := db.Conn(ctx)
	if err != nil {
		return err
	}
	defer conn.Close()
	const index = `CREATE VIRTUAL TABLE trial_word USING fts5 (part, note, content = '', columnsize = 0, tokenize = 'unicode61'); BEGIN`
	if _, err := conn.ExecContext(ctx, index); err != nil {
		return err
	}
	insert, err := conn.PrepareContext(ctx, `INSERT INTO trial_word (rowid, part, note) VALUES (?, ?, ?)`)
	if err != nil {
		return err
	}
	defer insert.Close()
	for more := true; more; more = rows.Next() {
		var seq int64
		var part, note string
		if err := rows.Scan(&seq, &part, &note); err != nil {
			return err
		}
		if _, err := insert.ExecContext(ctx, seq, part, note); err != nil {
			return err
		}
	}
	if err := rows.Err(); err != nil {
		return err
	}
	for _, w := range all {
		if w.recent, err = numbers(ctx, conn, `SELECT rowid FROM trial_word WHERE trial_word MATCH ?`, w.match); err != nil {
			return fmt.Errorf("look at the latest trials: %w", err)
		}
	}
	return nil
}

// numbers are the whole numbers that query gives, a row each.
func numbers(ctx context.Context, db querier, query string, args ...any) ([]int64, error) {
	rows, err := db.QueryContext(ctx, query, args...)
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	var all []int64
	for rows.Next() {
		var n int64
		if err := rows.Scan(&n); err != nil {
			return nil, err
		}
		all = append(all, n)
	}
	return all, rows.Err()
}

// list is ids for SQLite's json_each.
func list(ids []int64) string {
	text, _ := json.Marshal(ids) // numbers cannot fail
	return string(text)
}
