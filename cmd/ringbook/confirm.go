package main

import (
	"context"
	"errors"
	"fmt"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/store"

	"github.com/spf13/cobra"
)

func confirmCommand(a *app) *cobra.Command {
	var scope scopeFlags
	var id string
	cmd := &cobra.Command{
		Use:   "confirm",
		Short: "What was predicted against what was then measured",
		Long: `confirm takes the latest decision that recommend logged for the board revision in scope, or the one that --decision
names, and holds the peak it predicted against the trials that fitted its network since. A trial from before the decision
is evidence for it and no proof. Where the two do not agree, or the limit is not kept, it says what that tells of the loop,
and the exit code is 3.`,
		Example: `  ringbook confirm --board winch-drive --revision B
  ringbook confirm --decision 4f1c09be --json`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			if cmd.Flags().Changed("decision") && id == "" {
				return usagef("--decision \"\": give the decision's id, or the last six or more characters of it")
			}
			src, err := a.decided(ctx, &scope, id)
			if err != nil {
				return err
			}
			defer closing(src.Logbook, &err)
			d, err := pick(ctx, src, id)
			if err != nil {
				return err
			}
			c, err := recipes.Confirm(ctx, src, d)
			if errors.Is(err, recipes.ErrUnproven) && id == "" {
				return earlier(ctx, src, d, err)
			}
			if err != nil {
				return err
			}
			if a.json {
				err = a.printJSON(c)
			} else {
				p := page.New("Prediction and measurement of " + c.Board + " " + c.Revision)
				recipes.ProofPage(p, c)
				err = a.print(p)
			}
			if err == nil && !c.Confirmed {
				return errNo
			}
			return err
		},
	}
	scope.add(cmd)
	cmd.Flags().StringVar(&id, "decision", "", "`ID` of the decision, or its last six or more characters, instead of the latest")
	return cmd
}

// decided opens the logbook and gives the scope of trials. Which board revision is meant the decision says where one is
// named, and otherwise the trials in scope.
func (a *app) decided(ctx context.Context, flags *scopeFlags, id string) (recipes.Source, error) {
	scope, err := flags.read()
	if err != nil {
		return recipes.Source{}, err
	}
	if id != "" {
		lb, err := a.read(ctx)
		return recipes.Source{Logbook: lb, Scope: scope}, err
	}
	// The time flags say which trials may prove it, not which revision is meant.
	src, err := a.source(ctx, &scopeFlags{scope: store.Scope{Board: scope.Board, Revision: scope.Revision}})
	src.Scope.Since, src.Scope.Until = scope.Since, scope.Until
	return src, err
}

// pick is the decision that id names, or the latest of the board revision in scope.
func pick(ctx context.Context, src recipes.Source, id string) (store.Decision, error) {
	s := src.Scope
	if id != "" {
		d, err := src.Logbook.Decision(ctx, id)
		if err != nil {
			return d, fmt.Errorf("confirm: %w", err)
		}
		if s.Board != "" && s.Board != d.Board || s.Revision != "" && s.Revision != d.Revision {
			return d, usagef("decision %s is of %s %s, which is not what --board and --revision name; leave these out", store.ShortID(d.ID), d.Board, d.Revision)
		}
		return d, nil
	}
	for d, err := range src.Logbook.Decisions(ctx, store.Scope{Board: s.Board, Revision: s.Revision, Limit: 1}) {
		return d, err
	}
	return store.Decision{}, fmt.Errorf("confirm: no decision is logged for %s %s; `ringbook recommend` logs the one it prints", s.Board, s.Revision)
}

// earlier adds to err, that no trial serves the latest decision, the last decision before it that has one.
func earlier(ctx context.Context, src recipes.Source, latest store.Decision, err error) error {
	found := ""
	for d, e := range src.Logbook.Decisions(ctx, store.Scope{Board: latest.Board, Revision: latest.Revision}) {
		if e != nil {
			return e
		}
		if d.ID == latest.ID {
			continue
		}
		if _, e := recipes.Confirm(ctx, src, d); e == nil {
			found = store.ShortID(d.ID)
		} else if !errors.Is(e, recipes.ErrUnproven) {
			return e
		}
	}
	if found == "" {
		return err
	}
	return fmt.Errorf("%w; the decision before that has one, `ringbook confirm --decision %s`", err, found)
}
