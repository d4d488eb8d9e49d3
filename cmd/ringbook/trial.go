package main

import (
	"context"
	"fmt"
	"iter"
	"os"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/store"

	"github.com/spf13/cobra"
)

func trialCommand(a *app) *cobra.Command {
	return group("trial", "Log trials, list them, strike one",
		`  ringbook trial take --board winch-drive --revision B --network c --c 470p
  ringbook trial import trials.csv`,
		trialTake(a), trialEnter(a), trialImport(a), trialList(a), trialStrike(a))
}

func trialImport(a *app) *cobra.Command {
	return &cobra.Command{
		Use:   "import FILE.csv",
		Short: "Log many trials from a CSV file, all or none",
		Long: `import logs every row of a CSV file, or none when one is wrong; each wrong row is named by line and column. A dash
reads standard input. The header names the columns, in any order:

  board revision network c c_tol r r_tol probe_c bus_v current_a switching_hz
  ring_hz ring_hz_u decay_s decay_s_u peak_v peak_v_u at part note
  (and, where known: esr measured_c measured_c_u session)

Values are SI numbers or engineering notation (470p, 2n2, 1.8MHz, 5%); an empty cell was not read.`,
		Example: `  ringbook trial import trials.csv
  ringbook trial import --json - < trials.csv`,
		Args: words(1, 1),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			in, name := a.stdin, "standard input"
			if args[0] != "-" {
				f, err := os.Open(args[0])
				if err != nil {
					return fmt.Errorf("trial import: %w", err)
				}
				defer f.Close()
				in, name = f, args[0]
			}
			lb, err := a.open(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			n, err := lb.AddAll(ctx, store.ReadCSV(in), func(n int) { a.progress("%d trials read", n) })
			if err != nil {
				return fmt.Errorf("trial import: %s: nothing was logged: %w", name, err)
			}
			if a.json {
				return a.printJSON(map[string]any{"logged": n})
			}
			return a.say("%d trials logged in %s.", n, lb.Path())
		},
	}
}

func trialList(a *app) *cobra.Command {
	var scope scopeFlags
	cmd := &cobra.Command{
		Use:     "list",
		Short:   "The trials of one board revision with what they fitted and read",
		Example: `  ringbook trial list --board winch-drive --revision B`,
		Args:    words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			src, err := a.source(ctx, &scope)
			if err != nil {
				return err
			}
			defer closing(src.Logbook, &err)
			src.Scope.IncludeStruck = true
			if a.json {
				return a.printTrials(ctx, src.Logbook, src.Scope)
			}
			p := page.New("Trials of " + src.Scope.Board + " " + src.Scope.Revision)
			if err := recipes.Trials(ctx, p, src); err != nil {
				return err
			}
			return a.print(p)
		},
	}
	scope.add(cmd)
	return cmd
}

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
			if because == "" {
				return usagef("trial strike %s: say why with --because", args[0])
			}
			ctx := cmd.Context()
			lb, err := a.open(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			if err := lb.Strike(ctx, args[0], because); err != nil {
				return err
			}
			if a.json {
				t, err := lb.Trial(ctx, args[0])
				if err != nil {
					return err
				}
				return a.printJSON(map[string]any{"struck": t.ID, "because": because})
			}
			return a.say("Trial %s is struck: %s", args[0], because)
		},
	}
	cmd.Flags().StringVar(&because, "because", "", "what was wrong with it")
	return cmd
}

// printTrials writes the trials in scope as JSON, one after another, so that a long history needs no memory.
func (a *app) printTrials(ctx context.Context, lb *store.Logbook, s store.Scope) error {
	return a.printList("trials", func(yield func(any, error) bool) {
		for t, err := range lb.Trials(ctx, s) {
			if !yield(trialJSON(t), err) {
				return
			}
		}
	})
}

// logged says that a trial is on the disk.
func (a *app) logged(t snubber.Trial, id string) error {
	if a.json {
		t.ID = id
		return a.printJSON(trialJSON(t))
	}
	return a.say("Trial %s is logged.", store.ShortID(id))
}

// trialJSON is a trial under the CSV's names, unscaled SI, null for what was not read or stated.
func trialJSON(t snubber.Trial) map[string]any {
	num := func(v float64) any {
		if v == 0 {
			return nil
		}
		return v
	}
	m := map[string]any{
		"id": t.ID, "board": t.Board, "revision": t.Revision, "network": t.Network.Kind,
		"c": num(t.Network.C), "c_tol": num(t.Network.CTol), "r": num(t.Network.R), "r_tol": num(t.Network.RTol),
		"probe_c": num(t.ProbeC), "bus_v": num(t.Point.BusV), "current_a": num(t.Point.CurrentA), "switching_hz": num(t.Point.SwitchingHz),
		"at": t.At, "part": t.Part, "note": t.Note, "struck": nil,
	}
	if t.Struck != "" {
		m["struck"] = t.Struck
	}
	for _, q := range []snubber.Quantity{snubber.RingHz, snubber.DecayS, snubber.PeakV} {
		m[string(q)], m[string(q)+"_u"] = nil, nil
	}
	for _, r := range t.Readings {
		m[string(r.Quantity)], m[string(r.Quantity)+"_u"] = r.Value, num(r.U)
	}
	return m
}

// printList writes {"name": [ ... ]} as the items come.
func (a *app) printList(name string, items iter.Seq2[any, error]) error {
	w := newListWriter(a.stdout, name)
	for item, err := range items {
		if err != nil {
			return err
		}
		if err := w.add(item); err != nil {
			return err
		}
	}
	return w.close()
}
