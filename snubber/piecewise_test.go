package snubber

import (
	"math"
	"math/cmplx"
	"testing"

	"pgregory.net/rapid"
)

// drawn is a sum of up to four terms of very different speeds, growing slower than nothing.
func drawn(t *rapid.T) (*expSum, float64) {
	part := func(name string) float64 { return float64(rapid.IntRange(-1000, 1000).Draw(t, name)) / 1000 }
	p := &poles{n: rapid.IntRange(1, 4).Draw(t, "terms")}
	y := &expSum{p: p, c: part("c")}
	fast := 0.0
	for k := range p.n {
		s := math.Exp(rapid.Float64Range(-2, 3).Draw(t, "s"))
		p.s[k] = complex(-s, 0)
		if rapid.Bool().Draw(t, "rings") {
			p.s[k] = cmplx.Rect(s, math.Pi/2+rapid.Float64Range(0.001, 1.4).Draw(t, "angle"))
		}
		y.a[k] = complex(part("re"), 0)
		if imag(p.s[k]) != 0 {
			y.a[k] += complex(0, part("im"))
		}
		fast = math.Max(fast, s)
	}
	return y, fast
}

// Between a start and the first zero found the sum keeps its sign, on a grid far finer than its fastest term; at the zero it
// vanishes.
func TestPiecewiseNextZero(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		y, fast := drawn(t)
		size := math.Abs(y.c) + y.envelope(0)
		from := 0.0
		for range 6 {
			z := y.nextZero(from, 20, 0)
			if z.lost {
				t.Fatal("lost")
			}
			h := (z.t - from) / math.Ceil((z.t-from)*fast*50+10)
			for at := from + h; at < z.t-h/2; at += h {
				if v := y.at(at); v*z.sign < -1e-12*size {
					t.Fatalf("%+v %+v: %g at %g, between %g and the next zero at %g of sign %g", *y, *y.p, v, at, from, z.t, z.sign)
				}
			}
			if !z.found {
				return
			}
			if v := y.at(z.t); math.Abs(v) > 1e-12*size {
				t.Fatalf("%g at the zero %g", v, z.t)
			}
			from = z.t
		}
	})
}

// The integrals against Simpson's rule.
func TestPiecewiseIntegrals(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		y, _ := drawn(t)
		const n = 4000
		T := rapid.Float64Range(1e-6, 3).Draw(t, "T")
		one, two := 0.0, 0.0
		for k := 0; k <= n; k++ {
			w := 2 + 2*float64(k%2)
			if k == 0 || k == n {
				w = 1
			}
			v := y.at(T * float64(k) / n)
			one, two = one+w*v, two+w*v*v
		}
		size := math.Abs(y.c) + y.envelope(0)
		if got, want := y.integral(T), one*T/n/3; math.Abs(got-want) > 1e-8*T*size {
			t.Fatalf("integral %g, want %g", got, want)
		}
		if got, want := y.square(T), two*T/n/3; math.Abs(got-want) > 1e-8*T*size*size {
			t.Fatalf("integral of the square %g, want %g", got, want)
		}
	})
}

// The poles are the roots that a quartic was made of, over six decades.
func TestPiecewiseQuarticPoles(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := []float64{1}
		times := func(f ...float64) {
			next := make([]float64, len(d)+len(f)-1)
			for i, a := range d {
				for j, b := range f {
					next[i+j] += a * b
				}
			}
			d = next
		}
		for range 2 {
			w := math.Exp(rapid.Float64Range(-7, 7).Draw(t, "w"))
			times(w*w, 2*w*rapid.SampledFrom([]float64{0.01, 0.3, 0.9, 3}).Draw(t, "zeta"), 1)
		}
		p, ok := polesOf(d)
		if !ok {
			t.Skip("poles meet")
		}
		for _, s := range p.s[:p.n] {
			f, size := complex(0, 0), 0.0
			for m := 4; m >= 0; m-- {
				f = f*s + complex(d[m], 0)
				size = size*cmplx.Abs(s) + d[m]
			}
			if cmplx.Abs(f) > 1e-12*size {
				t.Fatalf("%v is no root of %v", s, d)
			}
		}
	})
}
