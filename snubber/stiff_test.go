package snubber_test

import (
	"math"
	"testing"

	"ringbook/snubber"
)

// With the node's capacitance ever smaller beside the network's, the peak goes over into that of a series L, R, C without
// one: McMurray's device voltage e/E = 1 - y with y” + 2 zeta y' + y = 0, y(0) = 1 - 2 zeta chi (W. McMurray, "Optimum
// Snubbers for Power Semiconductors", IEEE Trans. Ind. Appl. IA-8, 593, 1972, attribution from memory; the closed form is
// derived here). TurnOff finds the same by another search.
func TestPeakOfStiffCircuits(t *testing.T) {
	const l, cs, bus = 1e-6, 1e-7, 100.0
	z := math.Sqrt(l / cs)
	for _, a := range []float64{1e2, 1e4, 1e5, 1e6, 1e7} {
		for _, zeta := range []float64{0.1, 0.4, 0.7, 1.0, 1.5} {
			for _, chi := range []float64{0, 0.3, 1, 2, 5} {
				loop := snubber.Loop{Inductance: l, Capacitance: cs / a}
				n := snubber.Network{Kind: snubber.RC, C: cs, R: 2 * zeta * z}
				e := snubber.Excitation{Bus: bus, Current: chi * bus / z}
				r, err := snubber.Respond(loop, n, e)
				if err != nil {
					t.Fatal(err)
				}
				u, err := snubber.TurnOff(loop, n, e)
				if err != nil {
					t.Fatal(err)
				}
				if got, want := r.Peak().Volts, u.Peak.Volts; math.Abs(got-want) > 1e-6*want {
					t.Errorf("Cs/C = %g, zeta = %g, chi = %g: peak %.9g V, by the walk %.9g V", a, zeta, chi, got, want)
				}
			}
		}
	}
}
