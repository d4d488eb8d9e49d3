package snubber_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"ringbook/snubber"
	"ringbook/snubber/scipytest"
)

// turnOffCircuits draws circuits of every kind over the range a bench meets, reproducibly: 20 bare, 20 of a capacitor with ESR,
// 60 of rc and 100 of rcd, half of the last two with an inductive resistor.
func turnOffCircuits() (rows [][12]float64) {
	rng := rand.New(rand.NewPCG(4, 19))
	log := func(lo, hi float64) float64 { return lo * math.Pow(hi/lo, rng.Float64()) }
	for i := range 200 {
		l, c, e := log(2e-9, 2e-6), log(20e-12, 5e-9), log(5, 800)
		z := math.Sqrt(l / c)
		r, esr, cs := z*log(0.04, 0.3), 0.0, c*log(0.3, 10)
		if i%3 != 0 {
			esr = z * log(0.02, 0.2)
		}
		res, lr := z*log(0.2, 5), 0.0
		if i%2 == 0 {
			lr = l * log(0.03, 1)
		}
		row := [12]float64{l, c, r, res, lr, esr, cs, e, e / z * 2 * rng.Float64()}
		switch {
		case i < 20:
			row[3], row[4], row[5], row[6] = 0, 0, 0, 0
		case i < 40:
			row[3], row[4] = 0, 0
		case i >= 100:
			row[9], row[10], row[11] = 1, e*log(0.002, 0.1), z*log(0.02, 0.3)
		}
		rows = append(rows, row)
	}
	return rows
}

// Against SciPy's solve_ivp (DOP853, rtol 1e-10, restarted where its own event finder sees the diode switch) on 200 random
// circuits: the peak to 1e-6, each energy to 1e-5 of the whole.
func TestTurnOffAgainstSolveIVP(t *testing.T) {
	rows := turnOffCircuits()
	var want []struct{ Peak, Resistor, ESR, Loop, Diode, I2T, Left float64 }
	scipytest.Run(t, "testdata/turnoff.py", rows, &want)
	if len(want) != len(rows) {
		t.Fatalf("%d answers for %d circuits", len(want), len(rows))
	}
	worstPeak, worstEnergy, switched := 0.0, 0.0, 0
	for i, row := range rows {
		n := snubber.Network{Kind: snubber.RC, R: row[3], RInductance: row[4], ESR: row[5], C: row[6], DiodeDrop: row[10], DiodeOhm: row[11]}
		switch {
		case row[6] == 0:
			n.Kind = snubber.Bare
		case row[3] == 0:
			n.Kind = snubber.C
		case row[9] == 1:
			n.Kind = snubber.RCD
		}
		l := snubber.Loop{Inductance: row[0], Capacitance: row[1], Resistance: row[2]}
		e := snubber.Excitation{Bus: row[7], Current: row[8]}
		u, err := snubber.TurnOff(l, n, e)
		if err != nil {
			t.Fatalf("circuit %d: %v", i, err)
		}
		w := want[i]
		whole := u.Energy.Total()
		if w.Left > 1.01e-6*whole {
			t.Fatalf("circuit %d: SciPy stopped with %g J of %g J left", i, w.Left, whole)
		}
		near(t, "peak", u.Peak.Volts, w.Peak, 1e-6)
		near(t, "integral of the network's current squared", u.CapacitorI2T, w.I2T, 1e-5)
		near(t, "source", u.Source, (l.Capacitance+n.C)*e.Bus*e.Bus, 1e-6) // what both capacitors take at the bus's voltage
		worstPeak = math.Max(worstPeak, math.Abs(u.Peak.Volts/w.Peak-1))
		for _, x := range []struct {
			what      string
			got, want float64
		}{{"resistor", u.Energy.Resistor, w.Resistor}, {"ESR", u.Energy.ESR, w.ESR}, {"loop", u.Energy.Loop, w.Loop}, {"diode", u.Energy.Diode, w.Diode}} {
			off := math.Abs(x.got-x.want) / whole
			worstEnergy = math.Max(worstEnergy, off)
			if !(off <= 1e-5) {
				t.Errorf("circuit %d %v: %s takes %.9g J, SciPy has %.9g J: off by %.2g of all", i, row, x.what, x.got, x.want, off)
			}
		}
		if u.DiodePeakA > 0 {
			switched++
		}
	}
	if switched < 80 {
		t.Errorf("the diode conducts in %d of 100 circuits only: too few to be a check", switched)
	}
	t.Logf("worst peak off by %.2g, worst energy by %.2g of the whole; the diode conducts in %d", worstPeak, worstEnergy, switched)
}
