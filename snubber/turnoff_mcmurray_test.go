package snubber_test

import (
	"math"
	"testing"

	"ringbook/snubber"
)

// recovery is a diode that lets go of its recovery current chi E sqrt(Cs/L) across a snubber of damping zeta, without
// capacitance of its own but a ten-millionth of the snubber's.
func recovery(t testing.TB, zeta, chi float64) (u snubber.Turn, cs float64) {
	t.Helper()
	const l = 1e-6
	cs = 1e-9
	z := math.Sqrt(l / cs)
	u, err := snubber.TurnOff(snubber.Loop{Inductance: l, Capacitance: 1e-7 * cs},
		snubber.Network{Kind: snubber.RC, R: 2 * zeta * z, C: cs},
		snubber.Excitation{Bus: unitE, Current: chi * unitE / z})
	if err != nil {
		t.Fatal(err)
	}
	return u, cs
}

// A step with reverse recovery, against the normalised snubber of W. McMurray, "Optimum Snubbers for Power Semiconductors",
// IEEE Trans. Ind. Appl. IA-8, 593 (1972) (attribution from memory; turnoff_mcmurray_grid.csv and mcmurray_opt.csv hold his
// equations re-derived and integrated independently): peak, energy in the resistor, and the optimum damping.
func TestTurnOffMcMurray(t *testing.T) {
	for _, row := range table(t, "turnoff_mcmurray_grid.csv") {
		u, cs := recovery(t, row["zeta"], row["chi"])
		near(t, "peak", u.Peak.Volts/unitE, row["E1_over_E"], 2e-5) // the node's own capacitance rounds the first step
		near(t, "energy in the resistor", u.Energy.Resistor/(cs*unitE*unitE), row["WR_over_CE2"], 1e-5)
	}
	for _, row := range table(t, "mcmurray_opt.csv") {
		if row["chi"] == 0 {
			continue // no optimum: the peak falls for ever
		}
		best, _ := recovery(t, row["zeta_opt"], row["chi"])
		near(t, "least peak", best.Peak.Volts/unitE, row["E1_over_E"], 1e-5)
		for _, off := range []float64{0.9, 1.1} {
			if u, _ := recovery(t, row["zeta_opt"]*off, row["chi"]); u.Peak.Volts <= best.Peak.Volts {
				t.Errorf("chi %g: peak %g V at %g of the best damping, not above %g V", row["chi"], u.Peak.Volts, off, best.Peak.Volts)
			}
		}
	}
}
