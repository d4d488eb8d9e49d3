package leastsq

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

// Pearson's data (1901) with York's weights (1966).
var (
	pearsonX  = []float64{0.0, 0.9, 1.8, 2.6, 3.3, 4.4, 5.2, 6.1, 6.5, 7.4}
	pearsonY  = []float64{5.9, 5.4, 4.4, 4.6, 3.5, 3.7, 2.8, 2.8, 2.4, 1.5}
	pearsonUX = uncertainties(1000, 1000, 500, 800, 200, 80, 60, 20, 1.8, 1)
	pearsonUY = uncertainties(1, 1.8, 4, 8, 20, 20, 70, 70, 100, 500)
)

func uncertainties(weights ...float64) []float64 {
	u := make([]float64, len(weights))
	for i, w := range weights {
		u[i] = 1 / math.Sqrt(w)
	}
	return u
}

func repeat(v float64, n int) []float64 {
	out := make([]float64, n)
	floats.AddConst(v, out)
	return out
}

// Intercept and slope: published as 5.47991022 and -0.480533407 (Neri and others, J. Phys. E 22, 1989), recomputed
// to 15 digits. Uncertainties: the definition of York and others 2004, recomputed with 25 digits; the paper's own
// 0.295 and 0.058 are from memory. The correlated case is our own, computed by another route with 25 digits.
func TestLinePearson(t *testing.T) {
	for _, c := range []struct {
		name                      string
		corr                      float64
		a, b, ua, ub, covar, chi2 float64
	}{
		{"uncorrelated", 0, 5.479910224032865, -0.480533407446202, 0.2949707354931086, 0.05798500900077444, -0.01647254465811581, 11.86635319406145},
		{"correlated", 0.5, 5.534374564442235, -0.4928806168064463, 0.3134180266198179, 0.06297398021621106, math.NaN(), 9.57026513218981},
	} {
		t.Run(c.name, func(t *testing.T) {
			f, err := Line(pearsonX, pearsonY, pearsonUX, pearsonUY, repeat(c.corr, 10))
			if err != nil {
				t.Fatal(err)
			}
			check := func(what string, got, want, least float64) {
				d := digits(got, want)
				t.Logf("%s %.15g: %.1f digits", what, got, d)
				if !(d >= least) {
					t.Errorf("%s = %.15g, want %.15g", what, got, want)
				}
			}
			check("intercept", f.Intercept, c.a, 12)
			check("slope", f.Slope, c.b, 12)
			check("u(intercept)", f.UIntercept, c.ua, 9)
			check("u(slope)", f.USlope, c.ub, 9)
			if !math.IsNaN(c.covar) {
				check("covariance", f.Cov, c.covar, 9)
			}
			check("chi2", f.Chi2, c.chi2, 11)
			if f.Dof != 8 {
				t.Errorf("dof %d, want 8", f.Dof)
			}
			t.Logf("%d iterations", f.Iterations)
			for i := range f.X {
				if d := f.Y[i] - f.Intercept - f.Slope*f.X[i]; math.Abs(d) > 1e-13 {
					t.Errorf("adjusted point %d lies %g off the line", i, d)
				}
			}
		})
	}
}

// With x exact and y alike the line is that of ordinary least squares: 5.761185190439, -0.539577274984 for Pearson's
// data, recomputed with 25 digits. With y exact it is the same with the coordinates exchanged.
func TestLineLimits(t *testing.T) {
	one := repeat(1, 10)
	f, err := Line(pearsonX, pearsonY, nil, one, nil)
	if err != nil {
		t.Fatal(err)
	}
	if d := min(digits(f.Intercept, 5.761185190439038), digits(f.Slope, -0.5395772749840414)); d < 13 {
		t.Errorf("x exact: %.15g, %.15g", f.Intercept, f.Slope)
	}
	same := func(f LineFit, on, of []float64) {
		t.Helper()
		l, err := Linear(columns(true, [][]float64{on}), of, nil)
		if err != nil {
			t.Fatal(err)
		}
		got := []float64{f.Intercept, f.Slope, f.UIntercept, f.USlope, f.Cov, f.Chi2}
		want := []float64{l.P[0], l.P[1], l.StdErr(Stated)[0], l.StdErr(Stated)[1], l.Covariance(Stated).At(0, 1), l.Chi2}
		if agreement(got, want) < 12 {
			t.Errorf("got %v, ordinary least squares gives %v", got, want)
		}
	}
	same(f, pearsonX, pearsonY)

	// x = a' + b' y, so y = -a'/b' + x/b'.
	f, err = Line(pearsonX, pearsonY, one, nil, nil)
	if err != nil {
		t.Fatal(err)
	}
	cov := mat.NewSymDense(2, []float64{f.UIntercept * f.UIntercept, f.Cov, f.Cov, f.USlope * f.USlope})
	b := 1 / f.Slope
	back := Propagate(cov, mat.NewDense(2, 2, []float64{-b, f.Intercept * b * b, 0, -b * b}))
	same(LineFit{
		Intercept: -f.Intercept * b, Slope: b,
		UIntercept: math.Sqrt(back.At(0, 0)), USlope: math.Sqrt(back.At(1, 1)), Cov: back.At(0, 1), Chi2: f.Chi2,
	}, pearsonY, pearsonX)

	// One point exact in each coordinate only.
	ux, uy := append([]float64(nil), pearsonUX...), append([]float64(nil), pearsonUY...)
	ux[2], uy[7] = 0, 0
	exact, err := Line(pearsonX, pearsonY, ux, uy, nil)
	if err != nil {
		t.Fatal(err)
	}
	ux[2], uy[7] = 1e-9, 1e-9
	near, err := Line(pearsonX, pearsonY, ux, uy, nil)
	if err != nil {
		t.Fatal(err)
	}
	if digits(exact.Slope, near.Slope) < 9 || digits(exact.USlope, near.USlope) < 9 {
		t.Errorf("exact coordinates give %+v, nearly exact ones %+v", exact, near)
	}

	level, err := Line([]float64{1, 2, 4}, []float64{5, 5, 5}, repeat(0.1, 3), repeat(0.2, 3), nil)
	if err != nil || level.Slope != 0 || level.Intercept != 5 || level.Chi2 != 0 || !(level.USlope > 0) {
		t.Errorf("a level line: %v, %+v", err, level)
	}

	two, err := Line([]float64{0, 2e-10}, []float64{2e-18, 6e-18}, []float64{1e-12, 1e-12}, []float64{1e-20, 1e-20}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if digits(two.Slope, 2e-8) < 14 || digits(two.Intercept, 2e-18) < 14 || two.Dof != 0 || two.Chi2 > 1e-20 {
		t.Errorf("two points: %+v", two)
	}
}

// The line through points in other units is the same line, and so is that with the coordinates exchanged.
func TestLineInvariance(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		kx := math.Pow(10, rapid.Float64Range(-60, 60).Draw(t, "log kx"))
		ky := math.Pow(10, rapid.Float64Range(-60, 60).Draw(t, "log ky"))
		n := rapid.IntRange(4, 12).Draw(t, "n")
		slope := rapid.Float64Range(0.2, 5).Draw(t, "slope")
		list := func(name string, low, high float64) []float64 {
			return rapid.SliceOfN(rapid.Float64Range(low, high), n, n).Draw(t, name)
		}
		ux, uy, corr := list("ux", 0.005, 0.05), list("uy", 0.005, 0.05), list("corr", -0.9, 0.9)
		ex, ey := list("ex", -1, 1), list("ey", -1, 1)
		x, y := make([]float64, n), make([]float64, n)
		for i := range x {
			v := float64(i) / float64(n-1) * 2
			x[i], y[i] = v+ux[i]*ex[i], 0.5+slope*v+uy[i]*ey[i]
		}
		by := func(k float64, v []float64) []float64 { return floats.ScaleTo(make([]float64, n), k, v) }
		f, err := Line(x, y, ux, uy, corr)
		if err != nil {
			t.Fatal(err)
		}
		g, err := Line(by(kx, x), by(ky, y), by(kx, ux), by(ky, uy), corr)
		if err != nil {
			t.Fatal(err)
		}
		want := []float64{f.Slope, f.USlope, f.Intercept, f.UIntercept, f.Cov, f.Chi2}
		got := []float64{g.Slope / ky * kx, g.USlope / ky * kx, g.Intercept / ky, g.UIntercept / ky, g.Cov / ky / ky * kx, g.Chi2}
		if !floats.EqualFunc(got, want, func(a, b float64) bool { return math.Abs(a-b) <= 1e-10*(math.Abs(b)+1e-3) }) {
			t.Fatalf("units %g, %g: %v, want %v", kx, ky, got, want)
		}
		h, err := Line(y, x, uy, ux, corr)
		if err != nil {
			t.Fatal(err)
		}
		if digits(1/h.Slope, f.Slope) < 10 || digits(h.Chi2, f.Chi2) < 9 && f.Chi2 > 1e-6 {
			t.Fatalf("exchanged: slope %v, chi2 %v, want %v, %v", 1/h.Slope, h.Chi2, f.Slope, f.Chi2)
		}
	})
}

func TestLineRefuses(t *testing.T) {
	three, nan := []float64{1, 2, 3}, math.NaN()
	for _, c := range []struct {
		x, y, ux, uy, corr []float64
		says               string
	}{
		{nil, nil, nil, nil, nil, "0 points"},
		{three[:1], three[:1], nil, three[:1], nil, "1 points: a line needs two"},
		{three, three[:2], nil, three, nil, "3 values of x but 2 of y"},
		{three, three, three[:2], three, nil, "2 uncertainties of x for 3 points"},
		{three, three, nil, three, three[:1], "1 correlations for 3 points"},
		{[]float64{2, 2, 2}, three, nil, three, nil, "every x is 2"},
		{three, three, []float64{0, -1, 0}, three, nil, "point 1 has the uncertainty -1 in x"},
		{three, three, nil, []float64{1, 1, nan}, nil, "point 2 has the uncertainty NaN in y"},
		{three, three, nil, []float64{1, 0, 1}, nil, "point 1 (2, 2) has no uncertainty in either"},
		{three, three, nil, nil, nil, "point 0 (1, 1) has no uncertainty in either"},
		{three, []float64{1, nan, 1}, nil, three, nil, "point 1 is (2, NaN)"},
		{three, three, nil, three, []float64{0, 0, 1.5}, "point 2 has the correlation 1.5"},
		{three, []float64{5, 5, 5}, three, nil, nil, "no uncertainty across the line"},
		{ // uncertainties as large as the spread: the iteration swings without end
			[]float64{0.4631285074467805, -1.2067727387055893, 0.8237835860844145},
			[]float64{0.18757504013750023, -0.3139558606311811, 1.8722464296052492},
			[]float64{0.40367440891808487, 1.1687657558237023, 0.3523000340715326},
			[]float64{0.6095798876125476, 0.47642630784545165, 1.0345612477653479},
			nil, "no convergence after 500 iterations",
		},
	} {
		_, err := Line(c.x, c.y, c.ux, c.uy, c.corr)
		if err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("Line(%v, %v, %v, %v, %v): %v, want an error saying %q", c.x, c.y, c.ux, c.uy, c.corr, err, c.says)
		}
	}
}
