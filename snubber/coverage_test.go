package snubber

import (
	"math"
	"math/rand/v2"
	"sort"
	"testing"
)

// A lone rectangular error covers 95 % within 0.95 sqrt(3) standard uncertainties, a normal one within 1.96 (GUM 4.3.7 and
// G.1.3); in between the factor is that of draws of the distribution (GUM Supplement 1), to what 400,000 of them tell.
func TestCoverageFactor(t *testing.T) {
	if k := coverageFactor([]float64{1}); math.Abs(k-0.95*math.Sqrt(3)) > 0.02 {
		t.Errorf("one rectangular error: %g", k)
	}
	if k := coverageFactor(nil); k != normal95 {
		t.Errorf("no rectangular error: %g", k)
	}
	rng := rand.New(rand.NewPCG(1, 2))
	for _, shares := range [][]float64{{0.95}, {0.7, 0.7}, {0.8, -0.5}, {0.9, 0.3, 0.2}, {0.5, 0.5, 0.5, 0.3}, {0.3, 0.2, 0.1}} {
		rest := 1.0
		for _, w := range shares {
			rest -= w * w
		}
		draws := make([]float64, 400_000)
		for i := range draws {
			x := math.Sqrt(math.Max(rest, 0)) * rng.NormFloat64()
			for _, w := range shares {
				x += w * math.Sqrt(3) * (2*rng.Float64() - 1)
			}
			draws[i] = math.Abs(x)
		}
		sort.Float64s(draws)
		want := draws[len(draws)*95/100]
		if got := coverageFactor(shares); math.Abs(got-want) > 0.012 {
			t.Errorf("shares %v: factor %.4f, draws %.4f", shares, got, want)
		}
	}
}

// The probability inside an interval: 95 % within the factor, Student's and the normal's where they are meant, and that of
// draws elsewhere (to what 400,000 of them tell).
func TestLawInside(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 2))
	for _, l := range []law{{}, {dof: 4}, {shares: []float64{0.95}}, {shares: []float64{0.7, -0.6}}, {shares: []float64{0.9}, dof: 6}} {
		if p := l.inside(l.factor()); math.Abs(p-0.95) > 1e-5 {
			t.Errorf("%+v: %g within the factor", l, p)
		}
		if l.inside(0) > 1e-9 || l.inside(40) < 0.9999 || l.inside(7) < l.inside(5)-1e-9 {
			t.Errorf("%+v: %g at 0, %g at 5, %g at 7, %g at 40", l, l.inside(0), l.inside(5), l.inside(7), l.inside(40))
		}
		if l.dof > 0 {
			continue
		}
		rest := 1.0
		for _, w := range l.shares {
			rest -= w * w
		}
		for _, z := range []float64{0.3, 1, 2} {
			const n = 400_000
			held := 0
			for range n {
				x := math.Sqrt(rest) * rng.NormFloat64()
				for _, w := range l.shares {
					x += w * math.Sqrt(3) * (2*rng.Float64() - 1)
				}
				if math.Abs(x) <= z {
					held++
				}
			}
			if got, want := l.inside(z), float64(held)/n; math.Abs(got-want) > 0.004 {
				t.Errorf("%+v: %.4f within %g, draws %.4f", l, got, z, want)
			}
		}
	}
	if p, want := (law{dof: 4}).inside(3), 0.960058; math.Abs(p-want) > 1e-6 { // Student's t, 4 degrees of freedom: 1 - 2 * 0.019971
		t.Errorf("Student's: %.7f", p)
	}
}
