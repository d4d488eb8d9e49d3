package main

import (
	"context"
	"fmt"
	"strings"
	"time"

	"ringbook/store"

	"github.com/spf13/cobra"
)

// scopeFlags are the flags that say which trials are meant.
type scopeFlags struct {
	scope        store.Scope
	since, until string
}

func (s *scopeFlags) add(cmd *cobra.Command) {
	f := cmd.Flags()
	f.StringVar(&s.scope.Board, "board", "", "trials of the board of this `NAME` alone")
	f.StringVar(&s.scope.Revision, "revision", "", "trials of the revision of this `NAME` alone")
	f.StringVar(&s.since, "since", "", "trials read on this `DAY` or later: 2026-03-01, or RFC 3339")
	f.StringVar(&s.until, "until", "", "trials read on this `DAY` or earlier: 2026-03-31, or RFC 3339")
}

// read gives the scope as the flags have it.
func (s *scopeFlags) read() (store.Scope, error) {
	var err error
	if s.scope.Since, err = day("--since", s.since, 0); err != nil {
		return s.scope, err
	}
	if s.scope.Until, err = day("--until", s.until, 1); err != nil {
		return s.scope, err
	}
	if !s.scope.Since.IsZero() && !s.scope.Until.IsZero() && !s.scope.Since.Before(s.scope.Until) {
		return s.scope, usagef("--since %s does not come before --until %s", s.since, s.until)
	}
	return s.scope, nil
}

// day reads a day or an instant; of a day, the start of it or of one that comes days later.
func day(flag, text string, days int) (time.Time, error) {
	if text == "" {
		return time.Time{}, nil
	}
	if t, err := time.Parse(time.RFC3339, text); err == nil {
		return t, nil
	}
	t, err := time.ParseInLocation(time.DateOnly, text, time.Local)
	if err != nil {
		return time.Time{}, usagef("%s %q: write a day as 2026-03-01, or an instant as 2026-03-01T09:30:00Z", flag, text)
	}
	return t.AddDate(0, 0, days), nil
}

// oneRevision narrows a scope to the one board revision it holds, and refuses one that holds several.
func oneRevision(ctx context.Context, lb *store.Logbook, s store.Scope) (store.Scope, error) {
	revs, err := revisions(ctx, lb, s)
	if err != nil {
		return s, err
	}
	if len(revs) > 1 {
		return s, usagef("%d board revisions are in scope (%s), each with a loop of its own; name one with --board and --revision", len(revs), some(revs))
	}
	s.Board, s.Revision = revs[0].Board, revs[0].Name
	return s, nil
}

// revisions are the board revisions with a trial in scope, one at least.
func revisions(ctx context.Context, lb *store.Logbook, s store.Scope) ([]store.Revision, error) {
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
