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
