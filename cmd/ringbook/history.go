package main

import (
	"context"
	"errors"
	"slices"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/store"

	"github.com/spf13/cobra"
)

func historyCommand(a *app) *cobra.Command {
	var flags searchFlags
	cmd := &cobra.Command{
		Use:   "history [WORDS]",
		Short: "Search the trials in the logbook",
		Long: `history lists the latest trials, the newest last, struck ones with their reason. All that is asked for must hold.

WORDS are looked for in the board's and the revision's name, the part, the note and the names of instruments: all of them, in any
order, whatever their case and accents. '"lid off"' finds words that stand together, 'clam*' words that begin so.

Ranges are LOW..HIGH as values are written: 100p..1n; one end may be left out. A trial that does not state or read the
quantity is in no range. With --by the least, or with --reverse the greatest, come first; trials without it come last.

Where there are more trials than --limit, the last line names the trial to give to --next for the page that follows.`,
		Example: `  ringbook history
  ringbook history clamp "snubber board" --since 2026-03-01
  ringbook history --network rc --c 100p..1n --peak-v ..80V
  ringbook history --board winch-drive --by peak-v --reverse --limit 10
  ringbook history --struck only --json`,
		Args: cobra.ArbitraryArgs,
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			q, err := flags.query(args)
			if err != nil {
				return err
			}
			lb, err := a.read(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			found, err := find(ctx, lb, q)
			if err != nil {
				return err
			}
			if a.json {
				return a.printFound(found)
			}
			return a.printHistory(ctx, lb, q, found)
		},
	}
	flags.add(cmd)
	return cmd
}

// found is a page of a search.
type found struct {
	recipes.Found
	none bool
	next *string // the trial after which the next page begins; nil where there is none
}

// find searches, and looks at the first trial, so that what is wrong with the query is told before anything is printed.
func find(ctx context.Context, lb *store.Logbook, q store.Query) (found, error) {
	newestLast := q.Sort == store.ByTime && !q.Descending
	f := found{Found: recipes.Found{Order: order(q, newestLast)}}
	if q.Limit == 0 {
		f.Trials = lb.Search(ctx, q)
		for _, err := range lb.Search(ctx, first(q)) {
			return f, refused(err)
		}
		f.none = true
		return f, nil
	}
	limit := q.Limit
	q.Limit++ // one more tells whether there is a next page
	q.Descending = q.Descending || newestLast
	var trials []snubber.Trial
	for t, err := range lb.Search(ctx, q) {
		if err != nil {
			return f, refused(err)
		}
		trials = append(trials, t)
	}
	if len(trials) > limit {
		trials = trials[:limit]
		f.next = new(trials[limit-1].ID)
	}
	if newestLast {
		slices.Reverse(trials)
	}
	f.none = len(trials) == 0
	f.Trials = func(yield func(snubber.Trial, error) bool) {
		for _, t := range trials {
			if !yield(t, nil) {
				return
			}
		}
	}
	return f, nil
}

func first(q store.Query) store.Query {
	q.Limit = 1
	return q
}

// refused makes a query that makes no sense a matter of the command line.
func refused(err error) error {
	var fault *store.Fault
	var lite interface {
		error
		Code() int // SQLite's
	}
	switch {
	case err == nil, errors.As(err, &fault), errors.As(err, &lite), errors.Is(err, context.Canceled), errors.Is(err, context.DeadlineExceeded):
		return err
	case errors.Is(err, store.ErrNoTrial):
		return usagef("history: --next: there is no such trial in this logbook; give the one that the last line of a page names")
	}
	for range 2 { // what it says of the logbook, which has no part in it
		if inner := errors.Unwrap(err); inner != nil {
			err = inner
		}
	}
	return usagef("history: %w", err)
}

// printHistory prints the page, and how to see the next one.
func (a *app) printHistory(ctx context.Context, lb *store.Logbook, q store.Query, f found) error {
	p := page.New("History")
	if f.none && !everything(q) {
		p.Say("No trial is found. Ask for fewer words, or for wider ranges; `ringbook history` shows the latest trials.")
		return a.print(p)
	}
	if err := recipes.History(ctx, p, recipes.Source{Logbook: lb, Scope: q.Scope, Found: &f.Found}); err != nil {
		return err
	}
	if f.next != nil {
		p.Say("There are more: `--next %s` shows the page after this one.", *f.next)
	}
	return a.print(p)
}

// everything is whether a query asks for all trials there are.
func everything(q store.Query) bool {
	return q == store.Query{Scope: store.Scope{IncludeStruck: true, Limit: q.Limit}, Sort: q.Sort, Descending: q.Descending}
}

// printFound writes the trials as JSON, one after another, so that a long history needs no memory.
func (a *app) printFound(f found) error {
	w := newListWriter(a.stdout, "trials")
	for t, err := range f.Trials {
		if err != nil {
			return err
		}
		if err := w.add(trialJSON(t)); err != nil {
			return err
		}
	}
	return w.closeWith("next", f.next)
}
