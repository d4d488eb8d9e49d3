package snubber

import (
	"context"
	"math"
	"strconv"
	"testing"
)

// made is a series of a known circuit with effects, read without error but with the uncertainties stated.
func made(v circuitValues, tol float64, caps ...float64) []Trial {
	var trials []Trial
	for i, c := range append([]float64{0}, caps...) {
		x := v
		x[atCs] = c
		t := Trial{ID: strconv.Itoa(i), Board: "b", Revision: "A", Network: Network{Kind: Bare}, Point: OperatingPoint{BusV: v[atE], CurrentA: 1}}
		if c > 0 {
			t.Network = Network{Kind: C, C: c, CTol: tol}
		}
		s, _ := x.signs(true)
		for k, u := range []float64{0.002, 0.02, 0.002} {
			t.Readings = append(t.Readings, Reading{Quantity: observedQuantity[k], Value: s[k], U: u * s[k]})
		}
		trials = append(trials, t)
	}
	return trials
}

var plainLoop = circuitValues{atL: 12e-9, atC: 180e-12, atR: 0.6, atE: 48, atI0: 6, atRef: 48}

// A switch current that takes a third of the ring's period to fall is found from the peaks, and one that falls at once
// brings in no effect.
func TestFallTimeIsFound(t *testing.T) {
	slow := plainLoop
	slow[atFall] = 3e-9
	caps := []float64{68e-12, 150e-12, 330e-12, 680e-12, 1.5e-9, 3.3e-9}
	f, err := Fit(context.Background(), made(slow, 0.01, caps...))
	if err != nil {
		t.Fatal(err)
	}
	if len(f.Effects) != 1 || f.Effects[0].Unit != "s" || math.Abs(f.Effects[0].Size.Value-3e-9) > 4*f.Effects[0].Size.U {
		t.Errorf("effects %+v", f.Effects)
	}
	f, err = Fit(context.Background(), made(plainLoop, 0.01, caps...))
	if err != nil {
		t.Fatal(err)
	}
	if len(f.Effects) != 0 {
		t.Errorf("effects %+v without any", f.Effects)
	}
}

// A capacitor 40 % off what is written lies outside its 10 % by all odds; one 8 % off does not.
func TestMislabelledKnowsTheBound(t *testing.T) {
	trials := made(plainLoop, 0.1, 68e-12, 150e-12, 330e-12, 680e-12, 1.5e-9)
	trials[3].Network.C *= 1.4
	trials[5].Network.C *= 1.08
	obs, err := observe(trials)
	if err != nil {
		t.Fatal(err)
	}
	m := newModel(obs)
	for i, least := range map[int]bool{3: true, 5: false} {
		kept := without([]int{0, 1, 2, 3, 4, 5}, 3)
		if i == 5 {
			kept = without(kept, 5)
		}
		fit, err := m.fit(context.Background(), kept, m.from(Loop{12e-9, 180e-12, 0.6}), nil)
		if err != nil {
			t.Fatal(err)
		}
		p := (&outcome{model: m, fit: fit, kept: kept}).mislabelled(i)
		if least && p > 1e-6 || !least && p < 0.05 {
			t.Errorf("trial %d: probability %g", i, p)
		}
	}
}
