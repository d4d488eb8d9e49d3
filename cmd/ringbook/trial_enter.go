package main

import (
	"time"

	"ringbook/snubber"
	"ringbook/snubber/quantity"

	"github.com/spf13/cobra"
)

func trialEnter(a *app) *cobra.Command {
	var setup setupFlags
	var ring, ringU quantity.Hertz
	var decay, decayU quantity.Second
	var peak, peakU quantity.Volt
	var at string
	var captures []string
	cmd := &cobra.Command{
		Use:   "enter",
		Short: "Log one trial by hand",
		Long: `enter logs one trial with readings typed in. What was not read is left out. A *-u flag is a standard
uncertainty (k = 1). With --waveform the samples of a captured edge are logged with the trial, and what is not typed is
read from them: ring frequency, decay and peak.`,
		Example: `  ringbook trial enter --board winch-drive --revision B --network bare --probe-c 3p9 \
      --ring-hz 96.4MHz --ring-hz-u 0.3MHz --peak-v 92V --bus-v 48V
  ringbook trial enter --board winch-drive --revision B --network c --c 470p --bus-v 48V --waveform edge.csv`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			t, err := setup.trial()
			if err != nil {
				return err
			}
			t.At = time.Now()
			if at != "" {
				if t.At, err = time.Parse(time.RFC3339, at); err != nil {
					return usagef("--at %q: write an instant as 2026-03-01T09:30:00Z", at)
				}
			}
			for _, x := range []struct {
				q        snubber.Quantity
				flag     string
				value, u float64
			}{{snubber.RingHz, "ring-hz", float64(ring), float64(ringU)}, {snubber.DecayS, "decay-s", float64(decay), float64(decayU)}, {snubber.PeakV, "peak-v", float64(peak), float64(peakU)}} {
				switch {
				case x.value != 0:
					t.Readings = append(t.Readings, snubber.Reading{Quantity: x.q, Value: x.value, U: x.u})
				case x.u != 0:
					return usagef("--%s-u is given without --%s: an uncertainty needs its reading", x.flag, x.flag)
				}
			}
			ctx := cmd.Context()
			records, err := readCaptures(captures)
			if err != nil {
				return err
			}
			var warnings []string
			if len(records) > 0 {
				if warnings, err = fromCaptures(ctx, &t, records); err != nil {
					return err
				}
			}
			if len(t.Readings) == 0 && len(records) == 0 {
				return usagef("trial enter: no reading given; give --ring-hz, --decay-s or --peak-v, or a capture with --waveform")
			}
			lb, err := a.open(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			id, err := lb.AddWithWaveforms(ctx, t, records)
			if err != nil {
				return err
			}
			return a.logged(t, id, warnings)
		},
	}
	setup.add(cmd)
	f := cmd.Flags()
	f.Var(&ring, "ring-hz", "the ring's frequency as seen")
	f.Var(&ringU, "ring-hz-u", "its standard uncertainty")
	f.Var(&decay, "decay-s", "1/e time of the ring's envelope")
	f.Var(&decayU, "decay-s-u", "its standard uncertainty")
	f.Var(&peak, "peak-v", "highest voltage across the switch")
	f.Var(&peakU, "peak-v-u", "its standard uncertainty")
	f.StringSliceVar(&captures, "waveform", nil, "`FILES` with captures of the edge, as CSV; several are averaged")
	f.StringVar(&at, "at", "", "`TIME` it was read, RFC 3339; now where left out")
	return cmd
}
