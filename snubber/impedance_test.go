package snubber_test

import (
	"math"
	"testing"

	"ringbook/snubber"
)

// The impedance that the node shows, from the closed-form response to a current let go, beside the optimum of parallel
// damping: L beside C beside R in series with n C. The least peak of the impedance over R is
//
//	R/R0 = sqrt((2 + n)(4 + 3n)/(2 n^2 (4 + n)))   |Z|/R0 = sqrt(2 (2 + n))/n   at w/w0 = sqrt(2/(2 + n))
//
// R. D. Middlebrook 1978; R. W. Erickson, "Optimal Single Resistor Damping of Input Filters", APEC 1999; R. W. Erickson and
// D. Maksimovic, Fundamentals of Power Electronics, chapter on input filters: attributions from memory; the values of
// testdata/middlebrook_parallel.csv were recomputed by brute minimisation.
func TestOptimumDampingImpedance(t *testing.T) {
	rows := table(t, "middlebrook_parallel.csv")
	if len(rows) != 5 {
		t.Fatalf("%d rows", len(rows))
	}
	for _, row := range rows {
		n, q, peak, at := row["n"], row["Qopt"], row["Zpk_over_R0"], row["w_over_w0"]
		// impedance is |Z|/R0 at frequencies w, of w0, with the resistor R, of R0.
		impedance := func(r float64, w ...float64) (z []float64) {
			const l, c = 12e-9, 180e-12
			unit, r0 := math.Sqrt(l*c), math.Sqrt(l/c)
			resp, err := snubber.Respond(snubber.Loop{Inductance: l, Capacitance: c}, snubber.Network{Kind: snubber.RC, C: n * c, R: r * r0}, snubber.Excitation{Current: 1})
			if err != nil {
				t.Fatal(err)
			}
			const h = 0.005
			samples := make([]float64, 60001)
			for i := range samples {
				samples[i] = resp.NodeAt(float64(i) * h * unit)
			}
			// The loop's current let go is a step of 1/s into the node: its response times s is the impedance.
			for _, x := range w {
				z = append(z, fourier(samples, h*unit, x/unit)*x/unit/r0)
			}
			return z
		}
		near(t, "the peak's height", impedance(q, at)[0], peak, 1e-6)
		highest := func(r float64) (best float64) {
			var grid []float64
			for x := 0.6; x < 1.3; x += 0.01 {
				grid = append(grid, x*at)
			}
			for _, z := range impedance(r, grid...) {
				best = math.Max(best, z)
			}
			return best
		}
		if least := highest(q); highest(0.7*q) <= least || highest(1.4*q) <= least || least > peak*1.000001 {
			t.Errorf("n = %g: the peak is %g at R = %g R0, %g and %g beside it; want the least there, %g", n, least, q, highest(0.7*q), highest(1.4*q), peak)
		}
	}
}
