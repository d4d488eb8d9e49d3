package store

import (
	"context"
	"database/sql"
	"fmt"
	"strings"
	"time"

	"ringbook/snubber"
)

// shortLength is how many characters ShortID keeps, and leastID how many find a trial. They are counted from the id's
// end: the beginning of a UUID version 7 is its time, which trials of one sitting share; the end is random.
const (
	shortLength = 8
	leastID     = 6
)

// ShortID is the end of a trial's id, by which a person may name it. Of ten thousand trials the chance that any two share
// theirs is about 1 %; naming one of such two is an error that shows both ids in full.
func ShortID(id string) string {
	if len(id) <= shortLength {
		return id
	}
	return id[len(id)-shortLength:]
}

// Trial gives one trial, struck or not, by its id or by the last 6 or more characters of it. Errors are of kind
// ErrNoTrial where there is none.
func (lb *Logbook) Trial(ctx context.Context, id string) (snubber.Trial, error) {
	seq, _, err := aTrial.find(ctx, lb.db, id)
	if err != nil {
		return snubber.Trial{}, explain(lb.path, err)
	}
	for t, err := range lb.stream(ctx, "SELECT seq, at FROM trial WHERE seq = ?", []any{seq}) {
		return t, err
	}
	return snubber.Trial{}, aTrial.none(id)
}

// Strike marks a trial as wrong, with the reason. The trial stays readable, and leaves every fit. It is named as for
// Trial. Errors are of kind ErrNoTrial, or ErrStruck where it was struck before.
func (lb *Logbook) Strike(ctx context.Context, id, because string) error {
	if strings.TrimSpace(because) == "" {
		return fmt.Errorf("strike trial %s: no reason given; say what was wrong with it", quote(id))
	}
	if err := checkText("reason", because); err != nil {
		return fmt.Errorf("strike trial %s: %w", quote(id), err)
	}
	if len(because) > maxText {
		return fmt.Errorf("strike trial %s: the reason has %d bytes; it may have %d", quote(id), len(because), maxText)
	}
	err := lb.write(ctx, func(w *writer) error {
		seq, full, err := aTrial.find(ctx, w.conn, id)
		if err != nil {
			return err
		}
		var was string
		err = w.conn.QueryRowContext(ctx, `SELECT because FROM strike WHERE trial = ? ORDER BY at, id LIMIT 1`, seq).Scan(&was)
		switch {
		case err == nil:
			return fmt.Errorf("trial %s is %w (%s); it needs no second strike", full, ErrStruck, quote(was))
		case err != sql.ErrNoRows:
			return err
		}
		return w.strike(ctx, seq, full, time.Now(), because)
	})
	if err != nil {
		return fmt.Errorf("strike trial %s: %w", quote(id), err)
	}
	return nil
}

type querier interface {
	QueryContext(ctx context.Context, query string, args ...any) (*sql.Rows, error)
}

// nameable is a kind of row that a person may name by the end of its id.
type nameable struct {
	table string // and the word for it
	kind  error  // where there is none
	ids   string // where a person finds them
}

var (
	aTrial    = nameable{"trial", ErrNoTrial, "its history"}
	aDecision = nameable{"decision", ErrNoDecision, "its view decision_table"}
)

// find is the row number and the full id of the row that id names.
func (e nameable) find(ctx context.Context, db querier, id string) (seq int64, full string, err error) {
	end := strings.ToLower(strings.TrimSpace(id))
	if len(end) < leastID || len(end) > 36 || strings.Trim(end, "0123456789abcdef-") != "" {
		return 0, "", fmt.Errorf("%s %s: %w: name a %s by its id, or by the last %d or more characters of it", e.table, quote(id), e.kind, e.table, leastID)
	}
	rows, err := db.QueryContext(ctx, `SELECT seq, id FROM `+e.table+` WHERE substr(id, ?) = ? ORDER BY id LIMIT 4`, -len(end), end)
	if err != nil {
		return 0, "", err
	}
	defer rows.Close()
	var found []string
	for rows.Next() {
		if err := rows.Scan(&seq, &full); err != nil {
			return 0, "", err
		}
		found = append(found, full)
	}
	switch {
	case rows.Err() != nil:
		return 0, "", rows.Err()
	case len(found) == 0:
		return 0, "", e.none(id)
	case len(found) > 1:
		return 0, "", fmt.Errorf("%s %s: more than one id ends so: %s; give more of it", e.table, quote(id), strings.Join(found, ", "))
	}
	return seq, full, nil
}

func (e nameable) none(id string) error {
	return fmt.Errorf("%s %s: %w in this logbook; see the ids in %s", e.table, quote(id), e.kind, e.ids)
}
