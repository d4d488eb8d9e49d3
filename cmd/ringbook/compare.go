package main

import (
	"fmt"

	"ringbook/recipes"
	"ringbook/recipes/page"

	"github.com/spf13/cobra"
)

func compareCommand(a *app) *cobra.Command {
	var scope scopeFlags
	cmd := &cobra.Command{
		Use:   "compare REV REV...",
		Short: "Board revisions side by side",
		Long: `compare fits the trials of two or more revisions of a board together and puts their loops side by side: L, C, Z0, r and
the bare peak at one operating point with their intervals, and how each later revision differs from the first, with the
interval of the difference and the probability that it has the sign shown. A capacitor that served on several revisions
(trials with the same --part, or of one --session) counts once, so that its error does not pass for a difference.`,
		Example: `  ringbook compare A B --board winch-drive
  ringbook compare A B C --board winch-drive --json`,
		Args: words(2, 100),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			s, err := scope.read()
			if err != nil {
				return err
			}
			if s.Revision != "" {
				return usagef("--revision %q: compare takes the revisions as its words, as in `ringbook compare A B`", s.Revision)
			}
			lb, err := a.read(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			src := recipes.Source{Logbook: lb, Scope: s, Compare: args}
			c, err := src.Comparison(ctx)
			if err != nil {
				return err
			}
			if a.json {
				return a.printJSON(c)
			}
			p := page.New(fmt.Sprintf("Revisions of %s side by side", c.Revisions[0].Board))
			recipes.ComparisonPage(p, c)
			return a.print(p)
		},
	}
	scope.add(cmd)
	return cmd
}
