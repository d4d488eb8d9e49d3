package main

import (
	"ringbook/recipes"
	"ringbook/recipes/page"

	"github.com/spf13/cobra"
)

func trialList(a *app) *cobra.Command {
	var flags scopeFlags
	cmd := &cobra.Command{
		Use:   "list",
		Short: "The trials of each board revision with what they fitted and read",
		Long:  `list shows the trials in scope, board revision by board revision, struck ones with their reason.`,
		Example: `  ringbook trial list --board winch-drive --revision B
  ringbook trial list --json`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			scope, err := flags.read()
			if err != nil {
				return err
			}
			scope.IncludeStruck = true
			lb, err := a.read(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			revs, err := recipes.RevisionsInScope(ctx, lb, scope)
			if err != nil {
				return err
			}
			if a.json {
				return a.printTrials(ctx, lb, scope)
			}
			for i, r := range revs {
				if i > 0 {
					if err := a.say(""); err != nil {
						return err
					}
				}
				scope.Board, scope.Revision = r.Board, r.Name
				p := page.New("Trials of " + r.Board + " " + r.Name)
				if err := recipes.Trials(ctx, p, recipes.Source{Logbook: lb, Scope: scope}); err != nil {
					return err
				}
				if err := a.print(p); err != nil {
					return err
				}
			}
			return nil
		},
	}
	flags.add(cmd)
	return cmd
}
