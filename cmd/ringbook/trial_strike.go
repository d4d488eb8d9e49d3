package main

import (
	"fmt"
	"strings"

	"ringbook/store"

	"github.com/spf13/cobra"
)

func trialStrike(a *app) *cobra.Command {
	var because string
	cmd := &cobra.Command{
		Use:   "strike ID --because WHY",
		Short: "Mark a trial as wrong; it stays readable",
		Long: `strike marks a trial as wrong and says why. It leaves every fit and stays in the history. ID is the trial's
identity or the last six or more characters of it, as the tables show it.`,
		Example: `  ringbook trial strike 4f1c09be --because "the probe's ground clip was off"`,
		Args:    words(1, 1),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			if strings.TrimSpace(because) == "" {
				return usagef("trial strike %s: say why with --because", args[0])
			}
			ctx := cmd.Context()
			lb, err := a.open(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			t, err := lb.Trial(ctx, args[0])
			if err != nil {
				return fmt.Errorf("trial strike: %w", err)
			}
			if t.Struck != "" {
				return fmt.Errorf("trial strike: trial %s is struck already (%q); it needs no second strike", store.ShortID(t.ID), t.Struck)
			}
			if err := lb.Strike(ctx, t.ID, because); err != nil {
				return err
			}
			if a.json {
				return a.printJSON(map[string]any{"struck": t.ID, "because": because})
			}
			return a.say("Trial %s is struck: %s", store.ShortID(t.ID), because)
		},
	}
	cmd.Flags().StringVar(&because, "because", "", "`WHY` it is wrong")
	return cmd
}
