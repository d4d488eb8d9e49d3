package recipes

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"time"

	"ringbook/store"
)

// ErrSeveral is of a scope with more board revisions than the one that is to be.
var ErrSeveral = errors.New("each with a loop of its own")

// OneRevision narrows a scope to the one board revision it holds. Errors are ErrSeveral where it holds several, and those of
// RevisionsInScope.
func OneRevision(ctx context.Context, lb *store.Logbook, s store.Scope) (store.Scope, error) {
	revs, err := RevisionsInScope(ctx, lb, s)
	if err != nil {
		return s, err
	}
	if len(revs) > 1 {
		return s, fmt.Errorf("%d board revisions are in scope (%s), %w; name one with --board and --revision", len(revs), some(revs), ErrSeveral)
	}
	s.Board, s.Revision = revs[0].Board, revs[0].Name
	return s, nil
}

// RevisionsInScope are the board revisions with a trial in scope, one at least: where there is none, the error says what the
// logbook holds instead.
func RevisionsInScope(ctx context.Context, lb *store.Logbook, s store.Scope) ([]store.Revision, error) {
	revs, err := lb.Revisions(ctx, s)
	if err != nil || len(revs) > 0 {
		return revs, err
	}
	all, err := lb.Revisions(ctx, store.Scope{IncludeStruck: true})
	if err != nil {
		return nil, err
	}
	if len(all) == 0 {
		return nil, fmt.Errorf("logbook %s holds no trial; log one with `ringbook trial take`, `trial enter` or `trial import`", lb.Path())
	}
	var asked string
	if s.Board != "" {
		asked += fmt.Sprintf(" of board %q", s.Board)
	}
	if s.Revision != "" {
		asked += fmt.Sprintf(" of revision %q", s.Revision)
	}
	if !s.Since.IsZero() || !s.Until.IsZero() {
		asked += " in that time"
	}
	if !s.IncludeStruck {
		asked += " that stands"
	}
	return nil, fmt.Errorf("logbook %s holds no trial%s; it has trials of %s", lb.Path(), asked, some(all))
}

// some names a few board revisions, and says how many more there are.
func some(revs []store.Revision) string {
	const most = 6
	var names []string
	for i, r := range revs {
		if i == most {
			names = append(names, fmt.Sprintf("and %d more", len(revs)-most))
			break
		}
		names = append(names, r.Board+" "+r.Name)
	}
	return strings.Join(names, ", ")
}

// inWords is a scope for the foot of a page, the same wherever and in whatever time zone it is written.
func inWords(s store.Scope) string {
	said := "every board"
	switch {
	case s.Board != "":
		said = strings.TrimSpace(s.Board + " " + s.Revision)
	case s.Revision != "":
		said = "revision " + s.Revision + " of every board"
	}
	if !s.Since.IsZero() {
		said += ", since " + s.Since.UTC().Format(time.RFC3339)
	}
	if !s.Until.IsZero() {
		said += ", before " + s.Until.UTC().Format(time.RFC3339)
	}
	if s.Limit > 0 {
		said += fmt.Sprintf(", the latest %d", s.Limit)
	}
	if s.IncludeStruck {
		said += ", struck trials too"
	}
	return said
}
