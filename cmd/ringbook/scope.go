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
	f.StringVar(&s.scope.Board, "board", "", "trials of this board alone")
	f.StringVar(&s.scope.Revision, "revision", "", "trials of this revision alone")
	f.StringVar(&s.since, "since", "", "trials read on this day or later: 2026-03-01, or RFC 3339")
	f.StringVar(&s.until, "until", "", "trials read on this day or earlier: 2026-03-31, or RFC 3339")
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
	revs, err := lb.Revisions(ctx, s)
	if err != nil {
		return s, err
	}
	switch {
	case len(revs) == 1:
		s.Board, s.Revision = revs[0].Board, revs[0].Name
		return s, nil
	case len(revs) > 1:
		var names []string
		for i, r := range revs {
			if i == 6 {
				names = append(names, fmt.Sprintf("and %d more", len(revs)-i))
				break
			}
			names = append(names, r.Board+" "+r.Name)
		}
		return s, usagef("%d board revisions are in scope (%s), each with a loop of its own; name one with --board and --revision", len(revs), strings.Join(names, ", "))
	}
	if s.Board == "" && s.Revision == "" {
		return s, fmt.Errorf("logbook %s holds no trial in scope; log one with `ringbook trial take`, `trial enter` or `trial import`", lb.Path())
	}
	boards, err := lb.Boards(ctx)
	if err != nil {
		return s, err
	}
	var names []string
	for _, b := range boards {
		for _, r := range b.Revisions {
			names = append(names, b.Name+" "+r.Name)
		}
	}
	if len(names) > 8 {
		names = append(names[:8], "...")
	}
	return s, fmt.Errorf("no trial of board %q revision %q is in scope; the logbook has %s", s.Board, s.Revision, strings.Join(names, ", "))
}
