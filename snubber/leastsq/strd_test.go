package leastsq

import (
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// Certified results: NIST Statistical Reference Datasets (see testdata/strd/README.md).

// strdModel is a model of one predictor; grad, where given, writes its derivatives.
type strdModel struct {
	f    func(b []float64, x float64) float64
	grad func(g, b []float64, x float64)
}

var strdModels = map[string]strdModel{
	"Misra1a": {
		f: func(b []float64, x float64) float64 { return b[0] * (1 - math.Exp(-b[1]*x)) },
		grad: func(g, b []float64, x float64) {
			e := math.Exp(-b[1] * x)
			g[0], g[1] = 1-e, b[0]*x*e
		},
	},
	"BoxBOD": {
		f: func(b []float64, x float64) float64 { return b[0] * (1 - math.Exp(-b[1]*x)) },
		grad: func(g, b []float64, x float64) {
			e := math.Exp(-b[1] * x)
			g[0], g[1] = 1-e, b[0]*x*e
		},
	},
	"Lanczos3": {
		f: func(b []float64, x float64) float64 {
			return b[0]*math.Exp(-b[1]*x) + b[2]*math.Exp(-b[3]*x) + b[4]*math.Exp(-b[5]*x)
		},
		grad: func(g, b []float64, x float64) {
			for k := 0; k < 6; k += 2 {
				e := math.Exp(-b[k+1] * x)
				g[k], g[k+1] = e, -b[k]*x*e
			}
		},
	},
	"MGH17": {
		f: func(b []float64, x float64) float64 {
			return b[0] + b[1]*math.Exp(-x*b[3]) + b[2]*math.Exp(-x*b[4])
		},
		grad: func(g, b []float64, x float64) {
			e, f := math.Exp(-x*b[3]), math.Exp(-x*b[4])
			g[0], g[1], g[2], g[3], g[4] = 1, e, f, -b[1]*x*e, -b[2]*x*f
		},
	},
	"MGH09": {
		f: func(b []float64, x float64) float64 { return b[0] * (x*x + x*b[1]) / (x*x + x*b[2] + b[3]) },
		grad: func(g, b []float64, x float64) {
			num, den := x*x+x*b[1], x*x+x*b[2]+b[3]
			g[0], g[1] = num/den, b[0]*x/den
			g[2], g[3] = -b[0]*num*x/(den*den), -b[0]*num/(den*den)
		},
	},
	"Rat42": {
		f: func(b []float64, x float64) float64 { return b[0] / (1 + math.Exp(b[1]-b[2]*x)) },
		grad: func(g, b []float64, x float64) {
			e := math.Exp(b[1] - b[2]*x)
			d := 1 / (1 + e)
			g[0], g[1], g[2] = d, -b[0]*e*d*d, b[0]*x*e*d*d
		},
	},
	"Rat43": {
		f: func(b []float64, x float64) float64 { return b[0] / math.Pow(1+math.Exp(b[1]-b[2]*x), 1/b[3]) },
		grad: func(g, b []float64, x float64) {
			e := math.Exp(b[1] - b[2]*x)
			d := math.Pow(1+e, -1/b[3])
			g[0] = d
			g[1] = -b[0] * d * e / (1 + e) / b[3]
			g[2] = b[0] * d * x * e / (1 + e) / b[3]
			g[3] = b[0] * d * math.Log(1+e) / (b[3] * b[3])
		},
	},
	"Thurber": {
		f: func(b []float64, x float64) float64 {
			return (b[0] + x*(b[1]+x*(b[2]+x*b[3]))) / (1 + x*(b[4]+x*(b[5]+x*b[6])))
		},
		grad: func(g, b []float64, x float64) {
			num, den := b[0]+x*(b[1]+x*(b[2]+x*b[3])), 1+x*(b[4]+x*(b[5]+x*b[6]))
			p := 1.
			for k := range 4 {
				g[k] = p / den
				p *= x
				if k < 3 {
					g[4+k] = -num * p / (den * den)
				}
			}
		},
	},
	"Eckerle4": {
		f: func(b []float64, x float64) float64 {
			z := (x - b[2]) / b[1]
			return b[0] / b[1] * math.Exp(-z*z/2)
		},
		grad: func(g, b []float64, x float64) {
			z := (x - b[2]) / b[1]
			f := math.Exp(-z*z/2) / b[1]
			g[0], g[1], g[2] = f, b[0]*f*(z*z-1)/b[1], b[0]*f*z/b[1]
		},
	},
	"ENSO": {
		f: func(b []float64, x float64) float64 {
			t := 2 * math.Pi * x
			return b[0] + b[1]*math.Cos(t/12) + b[2]*math.Sin(t/12) +
				b[4]*math.Cos(t/b[3]) + b[5]*math.Sin(t/b[3]) +
				b[7]*math.Cos(t/b[6]) + b[8]*math.Sin(t/b[6])
		},
		grad: func(g, b []float64, x float64) {
			t := 2 * math.Pi * x
			g[0], g[1], g[2] = 1, math.Cos(t/12), math.Sin(t/12)
			for _, k := range []int{3, 6} {
				s, c := math.Sincos(t / b[k])
				g[k] = t / (b[k] * b[k]) * (b[k+1]*s - b[k+2]*c)
				g[k+1], g[k+2] = c, s
			}
		},
	},
}

// problem makes the fit of the model to y at x, with or without its derivatives.
func (m strdModel) problem(t testing.TB, x, y, start []float64, analytic bool) Problem {
	t.Helper()
	model := func(dst, b []float64) {
		for i := range dst {
			dst[i] = m.f(b, x[i])
		}
	}
	var jac func(dst *mat.Dense, b []float64)
	if analytic {
		jac = func(dst *mat.Dense, b []float64) {
			for i := range x {
				m.grad(dst.RawRowView(i), b, x[i])
			}
		}
	}
	pr, err := Curve(model, jac, y, nil, start)
	if err != nil {
		t.Fatal(err)
	}
	return pr
}

type certified struct{ value, sd []float64 }

func readCertified(t testing.TB) map[string]certified {
	all := map[string]certified{}
	for _, row := range readCSV(t, "strd_certified.csv") {
		c := all[row[0]]
		c.value = append(c.value, number(t, row[2]))
		c.sd = append(c.sd, number(t, row[3]))
		all[row[0]] = c
	}
	return all
}

// readSums gives the certified residual sums of squares.
func readSums(t testing.TB) map[string]float64 {
	all := map[string]float64{}
	for _, row := range readCSV(t, "strd_summary.csv") {
		all[row[0]] = number(t, row[5])
	}
	return all
}

// readSet gives the readings of a set and its predictors, column by column.
func readSet(t testing.TB, name string) (y []float64, x [][]float64) {
	for _, row := range readCSV(t, name+".csv") {
		y = append(y, number(t, row[0]))
		for k, cell := range row[1:] {
			if len(x) <= k {
				x = append(x, nil)
			}
			x[k] = append(x[k], number(t, cell))
		}
	}
	return y, x
}

func readStarts(t testing.TB, name string) (starts [2][]float64) {
	for _, row := range readCSV(t, name+"_start.csv") {
		for k := range starts {
			starts[k] = append(starts[k], number(t, row[1+k]))
		}
	}
	return starts
}

func readCSV(t testing.TB, name string) [][]string {
	t.Helper()
	f, err := os.Open(filepath.Join("testdata", "strd", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return rows[1:]
}

func number(t testing.TB, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(strings.TrimSpace(s), 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// digits is the number of significant digits in which got agrees with want: -log10 of the relative error, or of the
// absolute one where want is 0, at most 15.
func digits(got, want float64) float64 {
	e := math.Abs(got - want)
	if want != 0 {
		e /= math.Abs(want)
	}
	if e < 1e-15 {
		return 15
	}
	return -math.Log10(e)
}

// agreement gives the least number of digits in which two lists agree.
func agreement(got, want []float64) float64 {
	least := 15.
	for i := range want {
		d := digits(got[i], want[i])
		if !(d >= least) {
			least = d
		}
	}
	return least
}

func TestNonlinearStRD(t *testing.T) {
	certificates, sums := readCertified(t), readSums(t)
	for _, name := range []string{"Misra1a", "Lanczos3", "MGH17", "BoxBOD", "Rat42", "Rat43", "MGH09", "Thurber", "Eckerle4", "ENSO"} {
		y, x := readSet(t, name)
		for k, start := range readStarts(t, name) {
			for _, analytic := range []bool{true, false} {
				t.Run(fmt.Sprintf("%s/start%d/analytic=%t", name, k+1, analytic), func(t *testing.T) {
					pr := strdModels[name].problem(t, x[0], y, start, analytic)
					res, err := Fit(t.Context(), pr, Options{})
					if err != nil {
						t.Fatal(err)
					}
					want := certificates[name]
					value, sd := agreement(res.P, want.value), agreement(res.StdErr(Scatter), want.sd)
					sum := digits(res.Chi2, sums[name])
					t.Logf("digits: values %.1f, sd %.1f, sum of squares %.1f; %d iterations, %d evaluations, condition %.1e",
						value, sd, sum, res.Iterations, res.Evaluations, res.Condition)
					if res.Status != Converged {
						t.Errorf("status %v: %s", res.Status, res.Reason)
					}
					if !(value >= 7) {
						t.Errorf("values %v, certified %v", res.P, want.value)
					}
					if !(sd >= 7) {
						t.Errorf("standard deviations %v, certified %v", res.StdErr(Scatter), want.sd)
					}
					if !(sum >= 9) {
						t.Errorf("sum of squares %v, certified %v", res.Chi2, sums[name])
					}
				})
			}
		}
	}
}
