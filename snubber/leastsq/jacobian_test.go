package leastsq

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// ring is x = p4 + p0 exp(-p1 t) cos(2 pi p2 t + p3), a decaying oscillation, with its derivatives.
func ring(t float64, p, g []float64) float64 {
	e := math.Exp(-p[1] * t)
	s, c := math.Sincos(2*math.Pi*p[2]*t + p[3])
	if g != nil {
		g[0], g[1], g[2], g[3], g[4] = e*c, -t*p[0]*e*c, -2*math.Pi*t*p[0]*e*s, -p[0]*e*s, 1
	}
	return p[4] + p[0]*e*c
}

// ringProblem is a ring sampled n times at the spacing dt, with an error of size sigma that has no pattern.
func ringProblem(tb testing.TB, n int, dt, sigma float64, true_, start []float64, analytic bool) Problem {
	y := make([]float64, n)
	for i := range y {
		y[i] = ring(float64(i)*dt, true_, nil) + sigma*math.Sqrt2*math.Sin(float64(i*i)*1.7)
	}
	var jac func(dst *mat.Dense, p []float64)
	if analytic {
		jac = func(dst *mat.Dense, p []float64) {
			for i := range y {
				ring(float64(i)*dt, p, dst.RawRowView(i))
			}
		}
	}
	pr, err := Curve(func(dst, p []float64) {
		for i := range dst {
			dst[i] = ring(float64(i)*dt, p, nil)
		}
	}, jac, y, repeat(sigma, n), start)
	if err != nil {
		tb.Fatal(err)
	}
	return pr
}

// Two hundred cycles of a ring: a relative step fit for most models would turn its phase by radians.
func TestDifferencesOnManyCycles(t *testing.T) {
	true_ := []float64{1, 2e5, 50e6, 0.3, 0.02}
	start := []float64{0.8, 4e5, 50.02e6, 0, 0}
	exact := fit(t, ringProblem(t, 2000, 2e-9, 0.01, true_, start, true), Options{}, Converged)
	by := fit(t, ringProblem(t, 2000, 2e-9, 0.01, true_, start, false), Options{}, Converged)
	value, u := agreement(by.P, exact.P), agreement(by.StdErr(Stated), exact.StdErr(Stated))
	t.Logf("parameters %v; differences against derivatives: values %.1f digits, u %.1f; %d evaluations",
		by.P, value, u, by.Evaluations)
	if value < 6 || u < 6 {
		t.Errorf("differences %v, %v; derivatives %v, %v", by.P, by.StdErr(Stated), exact.P, exact.StdErr(Stated))
	}
}

// The Cramer-Rao bound of a sampled ring is the fit's own uncertainty: A = 1, f = 50 MHz, decay 0.02 of
// the angular frequency, phase 0.3, noise 0.01, 2000 samples 0.5 ns apart give sd(f) = 2231.57881 Hz (inverse of
// the Fisher information of A, phase, frequency and decay, recomputed with 25 digits).
func TestCramerRao(t *testing.T) {
	true_ := []float64{1, 0.02 * 2 * math.Pi * 50e6, 50e6, 0.3}
	for _, analytic := range []bool{true, false} {
		five := ringProblem(t, 2000, 0.5e-9, 0.01, append(true_, 0), append(true_, 0), analytic)
		pr := Problem{N: five.N, Start: true_, Residuals: func(dst, p []float64) {
			five.Residuals(dst, append(p[:4:4], 0))
		}}
		if analytic {
			all := mat.NewDense(five.N, 5, nil)
			pr.Jacobian = func(dst *mat.Dense, p []float64) {
				five.Jacobian(all, append(p[:4:4], 0))
				dst.Copy(all)
			}
		}
		res := &Result{}
		s := newSolver(&pr, Options{})
		copy(s.p, true_)
		pr.Residuals(s.r, s.p)
		s.differentiate(true)
		res.describe(s.jac, 1e-9)
		if u := res.StdErr(Stated)[2]; digits(u, 2231.57881) < 8 {
			t.Errorf("analytic %t: sd(f) = %.9g, want 2231.57881", analytic, u)
		}
		if u := res.StdErr(Stated)[1]; digits(u, 14127.1350) < 8 {
			t.Errorf("analytic %t: sd(decay) = %.9g, want 14127.1350", analytic, u)
		}
	}
}

// Next to a bound the differences stay on its inner side.
func TestDifferencesAtBounds(t *testing.T) {
	f := func(p float64) float64 { return math.Exp(p) + math.Sqrt(1+p) }
	for _, p := range []float64{1e-15, 1e-9, 1e-4, 0.5, 1 - 1e-9} {
		pr := Problem{N: 1, Start: []float64{0.5}, Bounds: []Bound{Between(0, 1)}, Residuals: func(dst, q []float64) {
			if q[0] < 0 || q[0] > 1 {
				t.Errorf("evaluated at %v, outside the bounds", q[0])
			}
			dst[0] = f(q[0])
		}}
		for _, refined := range []bool{false, true} {
			s := newSolver(&pr, Options{})
			s.p[0] = p
			pr.Residuals(s.r, s.p)
			s.differentiate(refined)
			want := math.Exp(p) + 0.5/math.Sqrt(1+p)
			least := 4.5
			if refined {
				least = 9
			}
			if d := digits(s.jac.At(0, 0), want); d < least {
				t.Errorf("at %v, refined %t: %v, want %v (%.1f digits)", p, refined, s.jac.At(0, 0), want, d)
			}
		}
	}
}

// A difference step that leaves the region where the model has values is cut down until it stays inside.
func TestDifferencesNextToNowhere(t *testing.T) {
	pr := Problem{N: 1, Start: []float64{1}, Residuals: func(dst, p []float64) { dst[0] = math.Sqrt(1.001 - p[0]) }}
	s := newSolver(&pr, Options{})
	s.p[0] = 1
	pr.Residuals(s.r, s.p)
	s.differentiate(true)
	if got, want := s.jac.At(0, 0), -0.5/math.Sqrt(0.001); digits(got, want) < 8 {
		t.Errorf("%v, want %v", got, want)
	}
}
