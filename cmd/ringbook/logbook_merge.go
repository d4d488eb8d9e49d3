package main

import (
	"context"

	"ringbook/store"

	"github.com/spf13/cobra"
)

func logbookMerge(a *app) *cobra.Command {
	return &cobra.Command{
		Use:   "merge OTHER.db",
		Short: "Bring in what another bench's logbook holds",
		Long: `merge adds every trial with its waveforms, every strike, every decision and every statement of a board that OTHER.db holds
and this logbook does not, all or nothing. Each is known by its identity: merging again adds nothing, and in which order
logbooks are merged makes no difference. OTHER.db is only read. What is not as it was logged there is refused.`,
		Example: `  ringbook logbook merge other-bench.db
  ringbook logbook merge --logbook all.db bench-2.db`,
		Args: words(1, 1),
		RunE: func(cmd *cobra.Command, args []string) error {
			m, err := a.merge(cmd.Context(), args[0])
			if err != nil {
				return err
			}
			return a.cameIn(m, args[0])
		},
	}
}

func (a *app) merge(ctx context.Context, other string) (m store.Merged, err error) {
	if err := readFirst(ctx, other); err != nil {
		return m, err
	}
	lb, err := a.open(ctx)
	if err != nil {
		return m, err
	}
	defer closing(lb, &err)
	return lb.Merge(ctx, other, a.passing("looked at"))
}

// cameIn says what came into the logbook from a file that holds entries with their identities.
func (a *app) cameIn(m store.Merged, from string) error {
	from = readable(from)
	switch {
	case a.json:
		return a.printJSON(map[string]any{"logged": m.Trials, "strikes": m.Strikes, "decisions": m.Decisions,
			"corrections": m.Corrections, "known": m.Known})
	case m.Added() == 0 && m.Known == 0:
		return a.say("Nothing came in: %s holds nothing.", from)
	case m.Added() == 0:
		return a.say("Nothing new came in: all that %s holds (%s) was here.", from, number(m.Known, "entry", "entries"))
	case m.Known == 0:
		return a.say("From %s came in: %s.", from, kinds(m.Trials, m.Strikes, m.Decisions, m.Corrections))
	}
	return a.say("From %s came in: %s; %s here before.", from, kinds(m.Trials, m.Strikes, m.Decisions, m.Corrections),
		number(m.Known, "entry of it was", "entries of it were"))
}
