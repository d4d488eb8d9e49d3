package leastsq

import (
	"context"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

// fit runs a fit that must have a result with the status.
func fit(t testing.TB, pr Problem, o Options, status Status) *Result {
	t.Helper()
	res, err := Fit(t.Context(), pr, o)
	if err != nil {
		t.Fatal(err)
	}
	if res.Status != status {
		t.Errorf("status %v (%s) after %d iterations, want %v", res.Status, res.Reason, res.Iterations, status)
	}
	return res
}

func misra1a(t testing.TB, start []float64, analytic bool) Problem {
	y, x := readSet(t, "Misra1a")
	return strdModels["Misra1a"].problem(t, x[0], y, start, analytic)
}

// TestStatedUncertainties holds the covariance by stated uncertainties against that by scatter: with u the
// certified residual standard deviation everywhere, both are the certified one.
func TestStatedUncertainties(t *testing.T) {
	y, x := readSet(t, "Misra1a")
	want := readCertified(t)["Misra1a"]
	s := math.Sqrt(readSums(t)["Misra1a"] / 12)
	for _, analytic := range []bool{true, false} {
		var jac func(dst *mat.Dense, b []float64)
		if analytic {
			jac = func(dst *mat.Dense, b []float64) {
				for i := range y {
					strdModels["Misra1a"].grad(dst.RawRowView(i), b, x[0][i])
				}
			}
		}
		pr, err := Curve(func(dst, b []float64) {
			for i := range dst {
				dst[i] = strdModels["Misra1a"].f(b, x[0][i])
			}
		}, jac, y, repeat(s, len(y)), []float64{500, 1e-4})
		if err != nil {
			t.Fatal(err)
		}
		res := fit(t, pr, Options{}, Converged)
		if agreement(res.StdErr(Stated), want.sd) < 9 || agreement(res.StdErr(Scatter), want.sd) < 9 {
			t.Errorf("stated %v, scatter %v, certified %v", res.StdErr(Stated), res.StdErr(Scatter), want.sd)
		}
		if digits(res.Chi2, 12) < 9 || res.Dof != 12 {
			t.Errorf("chi2 %v with %d degrees of freedom, want 12 and 12", res.Chi2, res.Dof)
		}
		c, v := res.Correlation(), res.Covariance(Stated)
		if digits(c.At(0, 1), v.At(0, 1)/res.StdErr(Stated)[0]/res.StdErr(Stated)[1]) < 12 || c.At(0, 0) != 1 {
			t.Errorf("correlation %v of covariance %v", mat.Formatted(c), mat.Formatted(v))
		}
	}
}

// The fit does not depend on the units of the parameters and of the readings.
func TestFitInvariance(t *testing.T) {
	want := readCertified(t)["Misra1a"]
	y, x := readSet(t, "Misra1a")
	rapid.Check(t, func(rt *rapid.T) {
		ky := math.Pow(10, rapid.Float64Range(-40, 40).Draw(rt, "log ky"))
		kx := math.Pow(10, rapid.Float64Range(-40, 40).Draw(rt, "log kx"))
		analytic := rapid.Bool().Draw(rt, "analytic")
		scaled := func(k float64, v []float64) []float64 { return floats.ScaleTo(make([]float64, len(v)), k, v) }
		pr := strdModels["Misra1a"].problem(t, scaled(kx, x[0]), scaled(ky, y), []float64{500 * ky, 1e-4 / kx}, analytic)
		if rapid.Bool().Draw(rt, "bounded") {
			pr.Bounds = []Bound{Above(0), Between(0, 1e-2/kx)}
		}
		res, err := Fit(t.Context(), pr, Options{})
		if err != nil || res.Status != Converged {
			rt.Fatalf("%v, %v", err, res)
		}
		u := res.StdErr(Scatter)
		got := []float64{res.P[0] / ky, res.P[1] * kx, u[0] / ky, u[1] * kx}
		if agreement(got, append(want.value[:2:2], want.sd...)) < 8 {
			rt.Fatalf("%v, certified %v", got, want)
		}
	})
}

func TestSingular(t *testing.T) {
	// p0 p1 can be told, p0 and p1 cannot; p2 can.
	x := []float64{1, 2, 3, 4, 5, 6}
	y := []float64{7.1, 8.9, 11.05, 13, 14.9, 17.05}
	line, err := Linear(columns(true, [][]float64{x}), y, nil)
	if err != nil {
		t.Fatal(err)
	}
	jac := func(dst *mat.Dense, p []float64) {
		for i, v := range x {
			dst.SetRow(i, []float64{p[1] * v, p[0] * v, 1})
		}
	}
	for _, j := range []func(dst *mat.Dense, p []float64){jac, nil} {
		pr, err := Curve(func(dst, p []float64) {
			for i, v := range x {
				dst[i] = p[0]*p[1]*v + p[2]
			}
		}, j, y, nil, []float64{1, 1, 1})
		if err != nil {
			t.Fatal(err)
		}
		pr.Names = []string{"gain", "turns", "offset"}
		res := fit(t, pr, Options{}, Singular)
		t.Log(res.Reason)
		if !strings.Contains(res.Reason, "in gain with") || !strings.Contains(res.Reason, "in turns:") {
			t.Errorf("reason %q should name gain and turns, and them only", res.Reason)
		}
		if d := min(digits(res.P[0]*res.P[1], line.P[1]), digits(res.P[2], line.P[0]), digits(res.Chi2, line.Chi2)); d < 9 {
			t.Errorf("parameters %v, chi2 %v; the line is %v, %v", res.P, res.Chi2, line.P, line.Chi2)
		}
		u, c := res.StdErr(Scatter), res.Covariance(Scatter)
		if !math.IsInf(u[0], 1) || !math.IsInf(u[1], 1) || digits(u[2], line.StdErr(Scatter)[0]) < 8 {
			t.Errorf("uncertainties %v, want +Inf, +Inf, %v", u, line.StdErr(Scatter)[0])
		}
		for i := range 3 {
			for j := range 3 {
				if math.IsNaN(c.At(i, j)) || math.IsNaN(res.Correlation().At(i, j)) || i != j && math.IsInf(c.At(i, j), 0) {
					t.Errorf("covariance %v", mat.Formatted(c))
				}
			}
		}
		if res.Dof != 4 || len(res.Blind) != 1 || !res.Undetermined[0] || !res.Undetermined[1] || res.Undetermined[2] {
			t.Errorf("dof %d, blind %v, undetermined %v", res.Dof, res.Blind, res.Undetermined)
		}
		if b := res.Blind[0]; digits(b[0]/b[1], -res.P[0]/res.P[1]) < 6 {
			t.Errorf("blind direction %v, want that of (%v, %v)", b, res.P[0], -res.P[1])
		}
	}

	// Equal columns in a linear fit; and a column of zeros.
	for _, extra := range [][]float64{x, make([]float64, 6)} {
		res, err := Linear(columns(true, [][]float64{x, extra}), y, nil)
		if err != nil {
			t.Fatal(err)
		}
		if res.Status != Singular || res.Dof != 4 || digits(res.Chi2, line.Chi2) < 10 || res.Undetermined[0] || !res.Undetermined[2] {
			t.Errorf("column %v again: %v, dof %d, chi2 %v (line %v), undetermined %v", extra, res.Status, res.Dof, res.Chi2, line.Chi2, res.Undetermined)
		}
	}
}

func TestEnds(t *testing.T) {
	pr := misra1a(t, []float64{500, 1e-4}, true)
	if res := fit(t, pr, Options{MaxIterations: 2}, IterationLimit); res.Iterations != 2 || len(res.P) != 2 || res.StdErr(Stated) == nil {
		t.Errorf("%+v", res)
	}

	ctx, cancel := context.WithCancel(t.Context())
	evaluations := 0
	stopping := pr
	stopping.Residuals = func(dst, p []float64) {
		pr.Residuals(dst, p)
		if evaluations++; evaluations == 5 {
			cancel()
		}
	}
	res, err := Fit(ctx, stopping, Options{})
	if err != nil || res.Status != Stopped || evaluations > 6 || !strings.Contains(res.Reason, "context canceled") {
		t.Errorf("%v, %+v after %d evaluations, want stopped", err, res, evaluations)
	}

	wrong := pr
	wrong.Jacobian = func(dst *mat.Dense, p []float64) {
		pr.Jacobian(dst, p)
		dst.Scale(-1, dst)
	}
	fit(t, wrong, Options{}, Stalled)

	broken := pr
	broken.Jacobian = func(dst *mat.Dense, p []float64) {
		pr.Jacobian(dst, p)
		if p[0] < 400 {
			dst.Set(3, 1, math.NaN())
		}
	}
	if res := fit(t, broken, Options{}, NonFinite); res.StdErr(Scatter) != nil || res.Covariance(Scatter) != nil || res.Correlation() != nil {
		t.Errorf("a covariance without a Jacobian: %+v", res)
	}

	// The model has no value for p >= 3, where the first step leads; the minimum is at 2.5.
	edge := Problem{N: 2, Start: []float64{0.1}, Residuals: func(dst, p []float64) {
		dst[0] = math.Sqrt(3-p[0]) - math.Sqrt(0.5)
		dst[1] = 0
	}}
	if res := fit(t, edge, Options{}, Converged); digits(res.P[0], 2.5) < 10 {
		t.Errorf("minimum at %v, want 2.5", res.P)
	}

	// As many readings as parameters: no scatter to judge by.
	y, x := readSet(t, "Misra1a")
	exact := strdModels["Misra1a"].problem(t, x[0][:2], y[:2], []float64{500, 1e-4}, true)
	if res := fit(t, exact, Options{}, Converged); res.Dof != 0 || !math.IsInf(res.StdErr(Scatter)[0], 1) || !(res.StdErr(Stated)[0] < math.Inf(1)) {
		t.Errorf("no degree of freedom: %+v, scatter %v", res, res.StdErr(Scatter))
	}
}

func TestFitRefuses(t *testing.T) {
	good := func() Problem { return misra1a(t, []float64{500, 1e-4}, true) }
	for _, c := range []struct {
		change func(*Problem, *Options)
		says   string
	}{
		{func(p *Problem, _ *Options) { p.Residuals = nil }, "no residual function"},
		{func(p *Problem, _ *Options) { p.Start = nil }, "Start is empty"},
		{func(p *Problem, _ *Options) { p.N = 1 }, "1 residuals cannot tell 2 parameters"},
		{func(p *Problem, _ *Options) { p.Start = []float64{1, math.NaN()} }, "parameter p1 starts at NaN"},
		{func(p *Problem, _ *Options) { p.Start = []float64{-1, -1e300} }, "sum of squares"},
		{func(p *Problem, _ *Options) { p.Names = []string{"a"} }, "1 names for 2"},
		{func(p *Problem, _ *Options) { p.Bounds = []Bound{Above(0)} }, "1 bounds for 2"},
		{func(p *Problem, _ *Options) { p.Typical = []float64{1} }, "1 typical sizes for 2"},
		{func(p *Problem, _ *Options) { p.Typical = []float64{1, -1} }, "typical size -1"},
		{func(p *Problem, _ *Options) { p.Bounds = []Bound{Above(500), {}} }, "start 500 does not lie above 500"},
		{func(p *Problem, _ *Options) { p.Bounds = []Bound{Below(500), {}} }, "does not lie below 500"},
		{func(p *Problem, _ *Options) { p.Bounds = []Bound{Between(600, 1), {}} }, "the lower one must be below"},
		{func(p *Problem, _ *Options) { p.Bounds = []Bound{Above(math.Inf(-1)), {}} }, "must be a finite number"},
		{func(_ *Problem, o *Options) { o.MaxIterations = -1 }, "MaxIterations = -1"},
		{func(_ *Problem, o *Options) { o.Offset = 1 }, "Offset = 1"},
		{func(_ *Problem, o *Options) { o.Step = -1 }, "Step = -1"},
		{func(_ *Problem, o *Options) { o.Rank = math.NaN() }, "Rank = NaN"},
	} {
		pr, o := good(), Options{}
		c.change(&pr, &o)
		if _, err := Fit(t.Context(), pr, o); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%v, want an error saying %q", err, c.says)
		}
	}

	model := func(dst, p []float64) {}
	for _, c := range []struct {
		y, u []float64
		says string
	}{
		{[]float64{1, 2}, []float64{1}, "2 readings but 1 uncertainties"},
		{[]float64{1, 2}, []float64{1, 0}, "reading 1 has the uncertainty 0"},
		{[]float64{1, math.Inf(1)}, nil, "reading 1 is +Inf"},
	} {
		if _, err := Curve(model, nil, c.y, c.u, []float64{1}); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("Curve: %v, want an error saying %q", err, c.says)
		}
		if _, err := Linear(mat.NewDense(2, 1, []float64{1, 1}), c.y, c.u); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("Linear: %v, want an error saying %q", err, c.says)
		}
	}
	if _, err := Curve(nil, nil, nil, nil, nil); err == nil {
		t.Error("Curve without a model: no error")
	}
	for _, c := range []struct {
		x    *mat.Dense
		y    []float64
		says string
	}{
		{nil, nil, "empty"},
		{mat.NewDense(2, 1, []float64{1, 1}), []float64{1}, "2 rows in the design matrix for 1 readings"},
		{mat.NewDense(1, 2, []float64{1, 1}), []float64{1}, "1 readings cannot tell 2 parameters"},
		{mat.NewDense(1, 1, []float64{math.NaN()}), []float64{1}, "row 0, column 0"},
	} {
		if _, err := Linear(c.x, c.y, nil); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("Linear: %v, want an error saying %q", err, c.says)
		}
	}
}

// Whatever the model and its start, no result holds a NaN, and a covariance is one: no correlation beyond 1.
func TestNoNaN(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 4).Draw(t, "parameters")
		m := n + rapid.IntRange(0, 4).Draw(t, "more readings")
		coefficient := rapid.SampledFrom([]float64{0, 0, 1, -1, 0.5, 1e-9, 1e9, 3})
		a := rapid.SliceOfN(coefficient, m*n, m*n).Draw(t, "a")
		y := rapid.SliceOfN(coefficient, m, m).Draw(t, "y")
		bend := coefficient.Draw(t, "bend")
		pr := Problem{N: m, Start: repeat(1, n), Residuals: func(dst, p []float64) {
			for i := range dst {
				var s float64
				for j, v := range p {
					s += a[i*n+j] * v
				}
				dst[i] = s - y[i]
				if bend != 0 {
					dst[i] += bend * s * math.Sqrt(s) // no value where s < 0
				}
			}
		}}
		if rapid.Bool().Draw(t, "bounded") {
			pr.Bounds = make([]Bound, n)
			pr.Bounds[0] = Above(0)
		}
		if rapid.Bool().Draw(t, "given Jacobian") {
			pr.Jacobian = func(dst *mat.Dense, p []float64) {
				for i := range m {
					row := a[i*n : (i+1)*n]
					s := floats.Dot(row, p)
					for j := range p {
						dst.Set(i, j, row[j])
						if bend != 0 {
							dst.Set(i, j, row[j]*(1+1.5*bend*math.Sqrt(s)))
						}
					}
				}
			}
		}
		res, err := Fit(context.Background(), pr, Options{})
		if err != nil {
			if !strings.Contains(err.Error(), "start where the model has values") {
				t.Fatal(err)
			}
			return
		}
		if bend == 0 && pr.Bounds == nil && pr.Jacobian != nil && res.Condition < 1e6 && res.Status != Converged && res.Status != Singular {
			t.Fatalf("a linear model with its derivatives given ends as %v: %s", res.Status, res.Reason)
		}
		all := append(append([]float64{res.Chi2}, res.P...), res.Residuals...)
		for _, by := range []Scale{Stated, Scatter} {
			all = append(all, res.StdErr(by)...)
			if c := res.Covariance(by); c != nil {
				all = append(all, c.RawSymmetric().Data...)
				all = append(all, res.Correlation().RawSymmetric().Data...)
			}
		}
		if c := res.Correlation(); c != nil && mat.Max(c) > 1+1e-9 {
			t.Fatalf("correlation %v", mat.Formatted(c))
		}
		if floats.HasNaN(all) {
			t.Fatalf("%+v", res)
		}
	})
}
