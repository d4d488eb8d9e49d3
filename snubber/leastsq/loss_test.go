package leastsq

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// A line with one wild reading, fitted robustly, against weights iterated by hand to their fixed point.
func TestLoss(t *testing.T) {
	x := []float64{0, 1, 2, 3, 4, 5, 6, 7}
	y := []float64{1.1, 2.8, 5.2, 6.9, 30, 11.1, 12.8, 15.1} // 1 + 2 x, but for the fifth
	u := repeat(0.2, len(x))
	design := columns(true, [][]float64{x})
	jac := func(dst *mat.Dense, _ []float64) { dst.Copy(design) }
	for _, c := range []struct {
		name string
		loss Loss
	}{{"Huber", Huber(1.345)}, {"Cauchy", Cauchy(2.385)}} {
		w := append([]float64(nil), u...)
		var want *Result
		var chi2 float64
		for range 500 {
			var err error
			if want, err = Linear(design, y, w); err != nil {
				t.Fatal(err)
			}
			chi2 = 0
			for i := range y {
				r := (want.P[0] + want.P[1]*x[i] - y[i]) / u[i]
				rho, slope := c.loss(r * r)
				chi2 += rho
				w[i] = u[i] / math.Sqrt(slope)
			}
		}
		for _, j := range []func(*mat.Dense, []float64){jac, nil} {
			pr, err := Curve(func(dst, p []float64) {
				for i := range dst {
					dst[i] = p[0] + p[1]*x[i]
				}
			}, j, y, u, []float64{0, 1})
			if err != nil {
				t.Fatal(err)
			}
			res := fit(t, pr, Options{Loss: c.loss}, Converged)
			t.Logf("%s: %v +- %v, %d iterations", c.name, res.P, res.StdErr(Stated), res.Iterations)
			if agreement(res.P, want.P) < 7 || digits(res.Chi2, chi2) < 9 || agreement(res.StdErr(Stated), want.StdErr(Stated)) < 6 {
				t.Errorf("%s: %v, %v, chi2 %v; weights by hand give %v, %v, %v", c.name,
					res.P, res.StdErr(Stated), res.Chi2, want.P, want.StdErr(Stated), chi2)
			}
			if res.Iterations > 30 { // a linear model takes few, weighted or not
				t.Errorf("%s: %d iterations", c.name, res.Iterations)
			}
			if math.Abs(res.P[1]-2) > 0.15 {
				t.Errorf("%s: slope %v is drawn away by the wild reading", c.name, res.P[1])
			}
		}
	}
}

// rho' is the derivative of rho, and rho starts as the plain square.
func TestLossSlopes(t *testing.T) {
	for name, loss := range map[string]Loss{"Huber": Huber(1.5), "Cauchy": Cauchy(2)} {
		if rho, slope := loss(0); rho != 0 || slope != 1 {
			t.Errorf("%s(0) = %v, slope %v", name, rho, slope)
		}
		for _, s := range []float64{0.1, 1, 2, 3, 10, 1e4} {
			h := 1e-5 * s
			hi, _ := loss(s + h)
			lo, _ := loss(s - h)
			if _, slope := loss(s); digits((hi-lo)/(2*h), slope) < 7 {
				t.Errorf("%s: slope %v at %v, difference quotient %v", name, slope, s, (hi-lo)/(2*h))
			}
		}
	}
}
