package main

import (
	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"

	"github.com/spf13/cobra"
)

func fitCommand(a *app) *cobra.Command {
	var scope scopeFlags
	cmd := &cobra.Command{
		Use:   "fit",
		Short: "The loop's parasitics across all trials in scope",
		Long: `fit takes every trial in scope that stands and gives the loop's inductance, capacitance and loss resistance, its
impedance and ring frequency, and the excitation, each with its 95 % interval.`,
		Example: `  ringbook fit --board winch-drive --revision B
  ringbook fit --board winch-drive --revision B --json`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			src, err := a.source(ctx, &scope)
			if err != nil {
				return err
			}
			defer closing(src.Logbook, &err)
			if !a.json {
				p := page.New("Loop of " + src.Scope.Board + " " + src.Scope.Revision)
				if err := recipes.Substitution(ctx, p, src); err != nil {
					return err
				}
				return a.print(p)
			}
			trials, err := src.Trials(ctx)
			if err != nil {
				return err
			}
			fit, err := snubber.Fit(ctx, trials)
			if err != nil {
				return err
			}
			return a.printJSON(fit)
		},
	}
	scope.add(cmd)
	return cmd
}
