package snubber_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"ringbook/snubber"
	"ringbook/snubber/scipytest"
)

// The joint fit of revisions that share some or all of their capacitors by SciPy's least_squares: figures, differences and
// the differences' standard uncertainties. What the comparison allows for beyond the fit, half a percent of each node's
// capacitance at rest, is taken off by its known size.
func TestRevisionsAgainstSciPy(t *testing.T) {
	for seed := range uint64(3) {
		rng := rand.New(rand.NewPCG(seed, 11))
		blue, green := aDrawer(rng, "blue"), aDrawer(rng, "green")
		third := revB
		third.name, third.loop.Inductance = "C", 11e-9
		sets := [][]snubber.Trial{revA.trials(rng, blue), revB.trials(rng, blue), third.trials(rng, green)}
		if seed == 2 { // some parts of another drawer
			half := revB.trials(rng, green)
			sets[1] = append(sets[1][:4], half[4:]...)
		}
		c := compare(t, sets...)
		for _, f := range c.Fits {
			if len(f.Warnings)+len(f.Effects)+len(f.SetAside) > 0 {
				t.Fatalf("seed %d: this one scatters: %q", seed, f.Warnings)
			}
		}
		parts := map[string]int{}
		var rows [][]float64
		for k, set := range sets {
			for _, x := range set {
				part := -1
				if x.Part != "" {
					if _, ok := parts[x.Part]; !ok {
						parts[x.Part] = len(parts)
					}
					part = parts[x.Part]
				}
				row := []float64{float64(k), float64(part), x.Network.C, x.Network.C * x.Network.CTol / math.Sqrt(3), x.ProbeC}
				for _, r := range x.Readings {
					row = append(row, r.Value, r.U)
				}
				rows = append(rows, row)
			}
		}
		var want struct {
			Chi2        float64
			Values      [][7]float64
			Differences [][7][2]float64
		}
		scipytest.Run(t, "testdata/revisions.py", map[string]any{"bus": pointAB.BusV, "start": []float64{11e-9, 190e-12, 0.55, 4.2}, "parts": len(parts), "trials": rows}, &want)
		near(t, "chi2", c.Chi2, want.Chi2, 1e-6)
		names := []string{"inductance_h", "capacitance_f", "impedance_ohm", "resistance_ohm", "ring_hz", "excitation_a", "peak_v"}
		for k, r := range c.Revisions {
			l := r.Loop
			for i, x := range []*snubber.Estimate{l.Inductance, l.Capacitance, l.Impedance, l.Resistance, l.RingHz, r.Excitation, r.Peak} {
				near(t, names[i], x.Value, want.Values[k][i], 1e-6)
			}
		}
		for k, to := range []string{"B", "C"} {
			for i, q := range names {
				d := difference(t, c, q, to)
				scale := math.Abs(want.Values[0][i])
				if off := math.Abs(d.Delta.Value - want.Differences[k][i][0]); off > 1e-6*scale {
					t.Errorf("seed %d: %s of %s: %g, SciPy %g", seed, q, to, d.Delta.Value, want.Differences[k][i][0])
				}
				rest := map[string]float64{"capacitance_f": 0.005, "impedance_ohm": 0.0025, "ring_hz": 0.0025}[q]
				u := math.Sqrt(d.Delta.U*d.Delta.U - math.Pow(rest*want.Values[0][i], 2) - math.Pow(rest*want.Values[k+1][i], 2))
				if q == "peak_v" {
					if u = d.Delta.U; u < want.Differences[k][i][1] || u > 1.2*want.Differences[k][i][1] {
						t.Errorf("seed %d: u of %s of %s = %g, SciPy %g without the allowance", seed, q, to, u, want.Differences[k][i][1])
					}
					continue
				}
				near(t, "u of the difference of "+q, u, want.Differences[k][i][1], 1e-3)
			}
		}
	}
}
