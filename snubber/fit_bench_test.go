package snubber_test

import (
	"context"
	"fmt"
	"math/rand/v2"
	"strconv"
	"testing"
	"time"

	"ringbook/snubber"
)

// series is a made-up series on one board from the closed form itself: n trials over the given numbers of capacitors and
// resistors (0 resistors: capacitors alone), with normal errors of the stated size.
func series(n, caps, resistors int, seed uint64) []snubber.Trial {
	rng := rand.New(rand.NewPCG(seed, 5))
	loop := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}
	e := snubber.Excitation{Bus: 48, Current: 4}
	cErr, rErr := make([]float64, caps), make([]float64, max(resistors, 1))
	for i := range cErr {
		cErr[i] = 1 + 0.05*(2*rng.Float64()-1)
	}
	for i := range rErr {
		rErr[i] = 1 + 0.01*(2*rng.Float64()-1)
	}
	var trials []snubber.Trial
	for i := range n {
		nominal := snubber.Network{Kind: snubber.Bare}
		true_ := nominal
		if k := i % (caps + 1); k > 0 {
			nominal = snubber.Network{Kind: snubber.C, C: 60e-12 * float64(k+1), CTol: 0.05}
			if caps > 20 {
				nominal.C = 60e-12 * (1 + 0.3*float64(k))
			}
			true_ = nominal
			true_.C *= cErr[k-1]
			if resistors > 0 && i%2 == 0 {
				j := rng.IntN(resistors)
				nominal.Kind, nominal.R, nominal.RTol = snubber.RC, 2+0.2*float64(j), 0.01
				true_.Kind, true_.R = snubber.RC, nominal.R*rErr[j]
			}
		}
		r, err := snubber.Respond(loop.WithProbe(4e-12), true_, e)
		if err != nil {
			panic(err)
		}
		t := snubber.Trial{ID: fmt.Sprintf("trial-%06d", i), Board: "b", Revision: "A", Network: nominal, ProbeC: 4e-12, At: time.Unix(int64(i), 0),
			Point: snubber.OperatingPoint{BusV: 48, CurrentA: 4, SwitchingHz: 300e3}}
		read := func(q snubber.Quantity, v, rel float64) {
			t.Readings = append(t.Readings, snubber.Reading{Quantity: q, Value: v * (1 + rel*rng.NormFloat64()), U: v * rel})
		}
		if hz, ok := r.RingHz(); ok && r.DampingRatio() < 0.3 {
			tau, _ := r.DecayS()
			read(snubber.RingHz, hz, 0.002)
			read(snubber.DecayS, tau, 0.02)
		}
		read(snubber.PeakV, r.Peak().Volts, 0.005)
		trials = append(trials, t)
	}
	return trials
}

func BenchmarkFit(b *testing.B) {
	for _, c := range []struct{ trials, caps, resistors int }{{7, 6, 0}, {10_000, 200, 0}, {10_000, 100, 100}, {100_000, 100, 100}} {
		b.Run(strconv.Itoa(c.trials)+"x"+strconv.Itoa(c.caps)+"C"+strconv.Itoa(c.resistors)+"R", func(b *testing.B) {
			trials := series(c.trials, c.caps, c.resistors, 1)
			b.ReportAllocs()
			for b.Loop() {
				if _, err := snubber.Fit(context.Background(), trials); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
