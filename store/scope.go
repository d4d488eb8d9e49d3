package store

import (
	"strings"
	"time"
)

// Scope says which trials are meant. The zero Scope is every trial that stands.
type Scope struct {
	Board         string    // its name; "" for any
	Revision      string    // its name; "" for any
	Since         time.Time // read at this time or later; zero for no bound
	Until         time.Time // read before this time; zero for no bound
	IncludeStruck bool      // trials marked as wrong too
	Limit         int       // the latest so many of them; 0 for all
}

// where is the scope as a condition on trial t.
func (s Scope) where() (string, []any) {
	conditions, args := []string{"TRUE"}, []any(nil)
	add := func(condition string, arg any) {
		conditions, args = append(conditions, condition), append(args, arg)
	}
	// One revision is asked for with =, not IN: so its trials come in the order of the index trial_by_revision, unsorted.
	const of = "(SELECT v.id FROM revision v JOIN board b ON b.id = v.board WHERE "
	switch {
	case s.Board != "" && s.Revision != "":
		add("t.revision = "+of+"b.name = ? AND v.name = ?)", s.Board)
		args = append(args, s.Revision)
	case s.Board != "":
		add("t.revision IN "+of+"b.name = ?)", s.Board)
	case s.Revision != "":
		add("t.revision IN "+of+"v.name = ?)", s.Revision)
	}
	if !s.Since.IsZero() {
		add("t.at >= ?", timeText(s.Since))
	}
	if !s.Until.IsZero() {
		add("t.at < ?", timeText(s.Until))
	}
	if !s.IncludeStruck {
		conditions = append(conditions, "NOT EXISTS (SELECT 1 FROM strike k WHERE k.trial = t.seq)")
	}
	return strings.Join(conditions, " AND "), args
}

// picked is the scope as a table of trials (seq, at) to select from.
func (s Scope) picked() (string, []any) {
	where, args := s.where()
	table := "SELECT t.seq AS seq, t.at AS at FROM trial t WHERE " + where
	if s.Limit > 0 {
		table += " ORDER BY t.at DESC, t.seq DESC LIMIT ?"
		args = append(args, s.Limit)
	}
	return table, args
}
