package snubber_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"ringbook/snubber"
	"ringbook/snubber/scipytest"
)

// randomCircuits draws circuits over the range a bench meets, reproducibly: rows of L, C, r, Rs, Cs, E, I0.
func randomCircuits(n int) [][7]float64 {
	rng := rand.New(rand.NewPCG(11, 7))
	log := func(lo, hi float64) float64 { return lo * math.Pow(hi/lo, rng.Float64()) }
	rows := make([][7]float64, n)
	for i := range rows {
		l, c := log(2e-9, 2e-6), log(20e-12, 5e-9)
		z := math.Sqrt(l / c)
		row := [7]float64{l, c, z * log(0.01, 0.3), 0, 0, log(5, 800), 0}
		row[6] = row[5] / z * 2 * rng.Float64()
		switch i % 4 {
		case 0: // bare
		case 1: // a capacitor alone
			row[4] = c * log(0.3, 20)
		default:
			row[3], row[4] = z*log(0.1, 10), c*log(0.3, 20)
		}
		rows[i] = row
	}
	return rows
}

func parts(row [7]float64) (snubber.Loop, snubber.Network, snubber.Excitation) {
	n := snubber.Network{Kind: snubber.Bare, R: row[3], C: row[4]}
	switch {
	case row[3] > 0:
		n.Kind = snubber.RC
	case row[4] > 0:
		n.Kind = snubber.C
	}
	return snubber.Loop{Inductance: row[0], Capacitance: row[1], Resistance: row[2]}, n,
		snubber.Excitation{Bus: row[5], Current: row[6]}
}

// Against SciPy's solve_ivp (DOP853, rtol 1e-12) on 200 random circuits: the peak, its time, and where the energy
// goes.
func TestPeakAgainstSolveIVP(t *testing.T) {
	rows := randomCircuits(200)
	var want [][4]float64
	scipytest.Run(t, "testdata/peaks.py", rows, &want)
	if len(want) != len(rows) {
		t.Fatalf("%d answers for %d circuits", len(want), len(rows))
	}
	worst := 0.0
	for i, row := range rows {
		l, n, e := parts(row)
		r, err := snubber.Respond(l, n, e)
		if err != nil {
			t.Fatal(err)
		}
		p := r.Peak()
		near(t, "peak", p.Volts, want[i][0], 1e-9)
		if want[i][1] >= 0 {
			near(t, "time of the peak", p.At, want[i][1], 1e-6)
		} else if !math.IsInf(p.At, 1) {
			t.Errorf("circuit %v: SciPy sees no overshoot, the closed form a peak of %g V at %g s", row, p.Volts, p.At)
		}
		worst = math.Max(worst, math.Abs(p.Volts/want[i][0]-1))
	}
	t.Logf("largest relative difference of the peak over %d circuits: %.1g", len(rows), worst)
}
