package main

import (
	"fmt"

	"ringbook/acquire"
	"ringbook/recipes"
	"ringbook/recipes/page"

	"github.com/spf13/cobra"
)

func trialTake(a *app) *cobra.Command {
	var setup setupFlags
	var rigFile string
	var withWaveform bool
	captures := 1
	cmd := &cobra.Command{
		Use:   "take",
		Short: "Read the instruments now and log one trial",
		Long: `take asks every instrument of the rig for its readings, repeats them, and logs one trial with their means and
standard uncertainties. Where an instrument of the rig fits networks by command, it fits this one first.

With --waveform the samples of the edge are captured, logged with the trial, and read: ring frequency, decay and peak are
then the waveform's, and no longer the instrument's own figures, which often are of the switching or of a noisy sample.

Fit the network with the supply off and the bus discharged.`,
		Example: `  ringbook trial take --board winch-drive --revision B --network bare --probe-c 3p9
  ringbook trial take --board winch-drive --revision B --network c --c 470p --c-tol 5% --rig rig.toml
  ringbook trial take --board winch-drive --revision B --network bare --probe-c 3p9 --waveform --captures 8`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			t, err := setup.trial()
			if err != nil {
				return err
			}
			switch {
			case captures < 1 || captures > mostCaptures:
				return usagef("--captures %d: it must be 1 to %d", captures, mostCaptures)
			case !withWaveform && cmd.Flags().Changed("captures"):
				return usagef("--captures %d is given without --waveform: add it, or leave --captures out", captures)
			case !withWaveform:
				captures = 0
			}
			ctx := cmd.Context()
			rig, err := acquire.LoadRig(rigFile)
			if err != nil {
				return err
			}
			lb, err := a.open(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			station, err := acquire.Open(ctx, rig)
			if err != nil {
				return unlogged(once(err))
			}
			defer func() {
				if e := station.Close(); e != nil && err == nil {
					err = e
				}
			}()
			t, records, warnings, err := a.take(ctx, station, t, captures)
			if err != nil {
				return unlogged(err)
			}
			id, err := lb.AddWithWaveforms(ctx, t, records)
			if err != nil {
				return unlogged(err)
			}
			t.ID = id
			if a.json {
				answer := trialJSON(t)
				answer["warnings"] = append([]string{}, warnings...)
				return a.printJSON(answer)
			}
			p := page.New("Trial of " + t.Board + " " + t.Revision)
			recipes.OneTrial(p, t)
			for _, w := range warnings {
				p.Warn("%s.", w)
			}
			return a.print(p)
		},
	}
	setup.add(cmd)
	cmd.Flags().StringVar(&rigFile, "rig", "rig.toml", "`FILE` with the instruments and what to ask of them")
	cmd.Flags().BoolVar(&withWaveform, "waveform", false, "capture the edge's samples too, log them, and read the ring from them")
	cmd.Flags().IntVar(&captures, "captures", captures, "`NUMBER` of captures to average")
	return cmd
}

// mostCaptures is the most captures of one trial: what is averaged away of the noise goes with the root of their number.
const mostCaptures = 100

func unlogged(err error) error { return fmt.Errorf("trial take: nothing was logged: %w", err) }
