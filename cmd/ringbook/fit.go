package main

import (
	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber/quantity"

	"github.com/spf13/cobra"
)

func fitCommand(a *app) *cobra.Command {
	var scope scopeFlags
	var onHand []string
	var drawer string
	cmd := &cobra.Command{
		Use:   "fit",
		Short: "The loop's parasitics across all trials in scope",
		Long: `fit takes every trial in scope that stands and gives the loop's inductance, capacitance and loss resistance, its
impedance and ring frequency, and the excitation, each with its 95 % interval. A trial that does not belong with the others
is set aside, with the reason. At the end it says which capacitor would tell most next, or that it is enough.`,
		Example: `  ringbook fit --board winch-drive --revision B
  ringbook fit --on-hand 100p,330p,1n0
  ringbook fit --board winch-drive --revision B --json`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			caps, err := partsOnHand("on-hand", onHand, func() flagValue { return new(quantity.Farad) })
			if err != nil {
				return err
			}
			if drawer != "" {
				if caps != nil {
					return usagef("--on-hand and --drawer both say what is on hand: leave one out")
				}
				if caps, err = capacitorsOf(drawer); err != nil {
					return err
				}
			}
			src, err := a.source(ctx, &scope)
			if err != nil {
				return err
			}
			src.OnHand = caps
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
			fit, err := src.Fit(ctx, trials)
			if err != nil {
				return err
			}
			return a.printJSON(fit)
		},
	}
	scope.add(cmd)
	cmd.Flags().StringSliceVar(&onHand, "on-hand", nil, "the `CAPACITORS` on hand, such as 100p,330p: which would tell most next")
	cmd.Flags().StringVar(&drawer, "drawer", "", "`FILE` with the parts on hand: which would tell most next")
	return cmd
}
