package leastsq

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

func TestBoundMaps(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := rapid.Float64Range(-10, 10).Draw(t, "a")
		w := rapid.Float64Range(0.1, 10).Draw(t, "w")
		b := rapid.SampledFrom([]Bound{{}, Above(a), Below(a + w), Between(a, a+w)}).Draw(t, "bound")
		p := a + w*rapid.Float64Range(0.001, 0.999).Draw(t, "part")
		q := b.inside(p)
		back, slope := b.outside(q)
		if math.Abs(back-p) > 1e-12*(math.Abs(a)+w) {
			t.Fatalf("%v: %v goes to %v and comes back as %v", b, p, q, back)
		}
		const h = 1e-5
		hi, _ := b.outside(q + h)
		lo, _ := b.outside(q - h)
		if math.Abs((hi-lo)/(2*h)-slope) > 1e-7*(math.Abs(slope)+1) {
			t.Fatalf("%v: slope %v, difference quotient %v", b, slope, (hi-lo)/(2*h))
		}
		for _, far := range []float64{-800, -40, 40, 800} {
			p, slope := b.outside(far)
			down, up := b.room(p)
			if down < 0 || up < 0 || math.IsNaN(slope) {
				t.Fatalf("%v: %v goes to %v, slope %v", b, far, p, slope)
			}
		}
	})
}

// Bounds that do not bind change nothing, the uncertainties included.
func TestBoundsThatDoNotBind(t *testing.T) {
	want := readCertified(t)["Misra1a"]
	for _, bounds := range [][]Bound{
		{Above(0), Above(0)},
		{Below(1e4), Below(1)},
		{Between(0, 1e3), Between(1e-5, 1e-2)},
		{Bound{}, Above(-1)},
	} {
		for _, analytic := range []bool{true, false} {
			pr := misra1a(t, []float64{500, 1e-4}, analytic)
			pr.Bounds = bounds
			res := fit(t, pr, Options{}, Converged)
			if agreement(res.P, want.value) < 9 || agreement(res.StdErr(Scatter), want.sd) < 8 || res.AtBound[0] || res.AtBound[1] {
				t.Errorf("%v: %v (%v), at bound %v, certified %v", bounds, res.P, res.StdErr(Scatter), res.AtBound, want)
			}
		}
	}
}

// A bound that cuts off the minimum is reached, and the other parameters are best for it.
func TestBoundThatBinds(t *testing.T) {
	for _, c := range []struct {
		bound Bound
		at    float64
	}{
		{Above(300), 300},
		{Between(300, 1000), 300},
		{Below(200), 200},
		{Between(-1, 200), 200},
	} {
		for _, analytic := range []bool{true, false} {
			fixed := misra1a(t, []float64{500, 1e-4}, false)
			held := Problem{N: fixed.N, Start: []float64{1e-4}, Residuals: func(dst, p []float64) {
				fixed.Residuals(dst, []float64{c.at, p[0]})
			}}
			want := fit(t, held, Options{}, Converged)

			start := 500.
			if c.at == 200 {
				start = 100
			}
			pr := misra1a(t, []float64{start, 1e-4}, analytic)
			pr.Bounds = []Bound{c.bound, {}}
			res := fit(t, pr, Options{}, Converged)
			t.Logf("%v, analytic %t: %v after %d iterations", c.bound, analytic, res.P, res.Iterations)
			if !res.AtBound[0] || res.AtBound[1] || digits(res.P[0], c.at) < 8 || digits(res.P[1], want.P[0]) < 6 {
				t.Errorf("%v: %v, at bound %v; held at the bound: %v", c.bound, res.P, res.AtBound, want.P)
			}
			for _, u := range res.StdErr(Scatter) {
				if !(u > 0) || math.IsInf(u, 0) {
					t.Errorf("%v: uncertainties %v", c.bound, res.StdErr(Scatter))
				}
			}
		}
	}
}
