package main

import (
	"context"
	"fmt"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/store"

	"github.com/spf13/cobra"
)

func recommendCommand(a *app) *cobra.Command {
	var scope scopeFlags
	var limits limitsFlags
	var drawer string
	var noRecord bool
	cmd := &cobra.Command{
		Use:   "recommend",
		Short: "R and C, ratings, losses, alternatives",
		Long: `recommend fits the trials in scope and gives the network of least loss whose peak, with the parts anywhere in
tolerance and the loop anywhere the trials allow, stays under the limit: --max-peak, or the board's device rating times
--derate. When nothing keeps the limits the nearest miss is shown and the exit code is 3.

A network that keeps them is logged as a decision with the trials it rests on, for ringbook confirm to hold what is then
measured against; asked the same of the same trials, the decision stands. With --no-record the logbook stays as it is.`,
		Example: `  ringbook recommend --board winch-drive --revision B --max-peak 80V
  ringbook recommend --max-peak 80V --c-tol 5% --r-tol 1% --c-series E6 --json
  ringbook recommend --network any --min-damping 30% --c-on-hand 270p,470p,1n0
  ringbook recommend --drawer drawer.toml`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			keep, err := limits.read()
			if err != nil {
				return err
			}
			if drawer != "" {
				if err := fromDrawer(drawer, &keep); err != nil {
					return err
				}
			}
			src, err := a.source(ctx, &scope)
			if err != nil {
				return err
			}
			defer closing(src.Logbook, &err)
			src.Limits = keep
			fit, rec, err := recipes.Recommendation(ctx, src)
			if err != nil {
				return err
			}
			var decision *string
			if rec.Met && !noRecord {
				if decision, err = a.decide(ctx, src, fit, rec); err != nil {
					return err
				}
			}
			if a.json {
				err = a.printJSON(struct {
					*snubber.Recommendation
					Decision *string `json:"decision"` // its id; null where none was logged
				}{rec, decision})
			} else {
				p := page.New("Network for " + src.Scope.Board + " " + src.Scope.Revision)
				recipes.ChoicePage(p, fit, rec)
				err = a.print(p)
			}
			if err == nil && !rec.Met {
				return errNo
			}
			return err
		},
	}
	scope.add(cmd)
	limits.add(cmd)
	cmd.Flags().StringVar(&drawer, "drawer", "", "`FILE` with the parts on hand: choose among these alone")
	cmd.Flags().BoolVar(&noRecord, "no-record", false, "log no decision")
	return cmd
}

// decide logs the recommendation as a decision and says so. The answer does not depend on the log: where it cannot be
// written, that is one more warning, and the id is nil.
func (a *app) decide(ctx context.Context, src recipes.Source, fit *snubber.FitResult, rec *snubber.Recommendation) (id *string, err error) {
	logged, fresh, err := func() (id string, fresh bool, err error) {
		// The last to close the file moves the write-ahead log into it, which one that reads alone cannot do.
		if err := src.Logbook.Close(); err != nil {
			return "", false, err
		}
		if src.Logbook, err = a.open(ctx); err != nil {
			return "", false, err
		}
		defer closing(src.Logbook, &err)
		return recipes.Decide(ctx, src, fit, rec)
	}()
	switch {
	case err != nil && ctx.Err() != nil:
		return nil, err
	case err != nil:
		rec.Warnings = append(rec.Warnings, fmt.Sprintf("the decision is not logged, so that nothing can confirm it: %v", err))
		return nil, nil
	case a.json: // its own field says it
	case fresh:
		a.progress("decision %s is logged; fit it, take a trial, and hold that against it with `ringbook confirm`", store.ShortID(logged))
	default:
		a.progress("decision %s stands; hold a trial against it with `ringbook confirm`", store.ShortID(logged))
	}
	return &logged, nil
}
