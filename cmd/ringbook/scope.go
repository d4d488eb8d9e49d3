package main

import (
	"errors"
	"time"

	"ringbook/recipes"
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

// severalIsUsage makes it a matter of the command line that more board revisions are in scope than were to be.
func severalIsUsage(err error) error {
	if errors.Is(err, recipes.ErrSeveral) {
		return &usageError{err}
	}
	return err
}
