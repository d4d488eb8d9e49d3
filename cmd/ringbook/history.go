package main

import (
	"ringbook/recipes"
	"ringbook/recipes/page"

	"github.com/spf13/cobra"
)

func historyCommand(a *app) *cobra.Command {
	var scope scopeFlags
	limit := 50
	cmd := &cobra.Command{
		Use:   "history",
		Short: "The trials in the logbook",
		Long:  `history lists the latest trials in scope, the newest last, struck ones with their reason.`,
		Example: `  ringbook history
  ringbook history --board winch-drive --since 2026-03-01 --limit 0`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			s, err := scope.read()
			if err != nil {
				return err
			}
			if limit < 0 {
				return usagef("--limit %d: it must be 0 (all) or more", limit)
			}
			s.IncludeStruck, s.Limit = true, limit
			lb, err := a.read(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			if a.json {
				return a.printTrials(ctx, lb, s)
			}
			p := page.New("History")
			if err := recipes.History(ctx, p, recipes.Source{Logbook: lb, Scope: s}); err != nil {
				return err
			}
			return a.print(p)
		},
	}
	scope.add(cmd)
	cmd.Flags().IntVar(&limit, "limit", limit, "`NUMBER` of trials at most; 0: all")
	return cmd
}
