package leastsq

import (
	"context"
	"math"
	"math/rand/v2"
	"strconv"
	"testing"
)

// A made-up problem whose dense form Fit solves too: blocks of exponential readings whose abscissa carries the error of
// a part of each kind.
type exponential struct {
	x, y, u       []float64
	first, second []int
	nFirst, nSec  int
}

func makeExponential(blocks, nFirst, nSec int) *exponential {
	rng := rand.New(rand.NewPCG(3, uint64(blocks)))
	e := &exponential{nFirst: nFirst, nSec: nSec}
	d := make([]float64, nFirst+nSec)
	for j := range d {
		d[j] = rng.NormFloat64()
	}
	for i := range blocks {
		x := 0.2 + 3*rng.Float64()
		first, second := i%(nFirst+1)-1, -1
		if first >= 0 && nSec > 0 && i%3 == 0 {
			second = i % nSec
		}
		y := 2.5 * math.Exp(-0.7*x*e.factor(first, second, d))
		u := 0.01
		e.x, e.y, e.u = append(e.x, x), append(e.y, y+u*rng.NormFloat64()), append(e.u, u)
		e.first, e.second = append(e.first, first), append(e.second, second)
	}
	return e
}

const expTol = 0.03

func (e *exponential) factor(first, second int, d []float64) float64 {
	f := 1.0
	if first >= 0 {
		f += expTol * d[first]
	}
	if second >= 0 {
		f += expTol * d[e.nFirst+second]
	}
	return f
}

func (e *exponential) partitioned() Partitioned {
	return Partitioned{
		Shared: 2, First: e.nFirst, Second: e.nSec, Blocks: len(e.x), Start: []float64{1, 1},
		Eval: func(i int, p, d []float64, derivatives bool, b *Block) {
			f := e.factor(e.first[i], e.second[i], d)
			m := p[0] * math.Exp(-p[1]*e.x[i]*f)
			b.R = append(b.R[:0], (m-e.y[i])/e.u[i])
			b.First, b.Second = e.first[i], e.second[i]
			b.P = append(b.P[:0], m/p[0]/e.u[i], -e.x[i]*f*m/e.u[i])
			byF := -p[1] * e.x[i] * m * expTol / e.u[i]
			b.D[0], b.D[1] = append(b.D[0][:0], byF), append(b.D[1][:0], byF)
		},
	}
}

// dense is the same problem with every nuisance a parameter and its prior a reading.
func (e *exponential) dense() Problem {
	n := e.nFirst + e.nSec
	start := make([]float64, 2+n)
	start[0], start[1] = 1, 1
	names := []string{"a", "b"}
	for j := range n {
		names = append(names, "d"+strconv.Itoa(j))
	}
	return Problem{
		Start: start, N: len(e.x) + n,
		Residuals: func(dst, p []float64) {
			for i := range e.x {
				dst[i] = (p[0]*math.Exp(-p[1]*e.x[i]*e.factor(e.first[i], e.second[i], p[2:])) - e.y[i]) / e.u[i]
			}
			copy(dst[len(e.x):], p[2:])
		},
	}
}

// Eliminating the nuisances gives what the dense fit of them all gives: parameters, nuisances, chi2 and covariances.
func TestPartitionedIsTheDenseFit(t *testing.T) {
	for _, c := range []struct{ blocks, first, second int }{{12, 0, 0}, {20, 4, 0}, {60, 6, 5}} {
		e := makeExponential(c.blocks, c.first, c.second)
		got, err := FitPartitioned(context.Background(), e.partitioned(), Options{})
		if err != nil {
			t.Fatal(err)
		}
		if got.Status != Converged {
			t.Fatalf("%v: %s", got.Status, got.Reason)
		}
		want, err := Fit(context.Background(), e.dense(), Options{})
		if err != nil {
			t.Fatal(err)
		}
		close := func(what string, a, b, scale float64) {
			t.Helper()
			if math.Abs(a-b) > 1e-6*scale {
				t.Errorf("%+v: %s = %.10g, dense %.10g", c, what, a, b)
			}
		}
		cov := want.Covariance(Stated)
		close("chi2", got.Chi2, want.Chi2, want.Chi2)
		for i := range 2 {
			close("parameter", got.P[i], want.P[i], math.Sqrt(cov.At(i, i)))
			for j := range 2 {
				close("covariance", got.Cov.At(i, j), cov.At(i, j), math.Sqrt(cov.At(i, i)*cov.At(j, j)))
			}
		}
		for j := range got.D {
			close("nuisance", got.D[j], want.P[2+j], 1)
			for i, x := range got.Cross(j) {
				close("cross covariance", x, cov.At(i, 2+j), math.Sqrt(cov.At(i, i)))
			}
		}
		if c.second > 0 {
			joint := got.Joint(1, 2)
			at := []int{0, 1, 2 + 1, 2 + c.first + 2}
			for i, a := range at {
				for j, b := range at {
					close("joint covariance", joint.At(i, j), cov.At(a, b), math.Sqrt(cov.At(a, a)*cov.At(b, b)))
				}
			}
		}
	}
}

// A shared parameter that no reading tells makes the fit singular, not wrong.
func TestPartitionedSingular(t *testing.T) {
	pr := makeExponential(10, 2, 0).partitioned()
	pr.Shared, pr.Start = 3, []float64{1, 1, 1}
	eval := pr.Eval
	pr.Eval = func(i int, p, d []float64, derivatives bool, b *Block) {
		eval(i, p[:2], d, derivatives, b)
		b.P = append(b.P, 0)
	}
	got, err := FitPartitioned(context.Background(), pr, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if got.Status != Singular || got.Cov != nil {
		t.Errorf("status %v, covariance %v", got.Status, got.Cov)
	}
}

func TestPartitionedRefuses(t *testing.T) {
	good := makeExponential(10, 2, 0).partitioned()
	for what, spoil := range map[string]func(*Partitioned){
		"no parameters": func(p *Partitioned) { p.Shared, p.Start = 0, nil },
		"no blocks":     func(p *Partitioned) { p.Blocks = 0 },
		"short start":   func(p *Partitioned) { p.Start = []float64{1} },
		"NaN start":     func(p *Partitioned) { p.Start = []float64{math.NaN(), 1} },
		"no Eval":       func(p *Partitioned) { p.Eval = nil },
	} {
		pr := good
		spoil(&pr)
		if _, err := FitPartitioned(context.Background(), pr, Options{}); err == nil {
			t.Errorf("%s: accepted", what)
		}
	}
}

// One block ten uncertainties off pulls the plain fit and hardly the robust one.
func TestPartitionedRobust(t *testing.T) {
	e := makeExponential(20, 0, 0)
	clean, _ := FitPartitioned(context.Background(), e.partitioned(), Options{})
	e.y[0] += 100 * e.u[0]
	plain, _ := FitPartitioned(context.Background(), e.partitioned(), Options{})
	robust, err := FitPartitioned(context.Background(), e.partitioned(), Options{Loss: Cauchy(2.385)})
	if err != nil {
		t.Fatal(err)
	}
	off := func(r *PartitionedResult) float64 { return math.Abs(r.P[1]-clean.P[1]) / math.Sqrt(clean.Cov.At(1, 1)) }
	if off(plain) < 2 || off(robust) > 1 {
		t.Errorf("off by %.2g uncertainties plain and %.2g robust", off(plain), off(robust))
	}
}

func BenchmarkPartitioned(b *testing.B) {
	for _, n := range []int{10, 10_000} {
		b.Run(strconv.Itoa(n), func(b *testing.B) {
			e := makeExponential(n, min(n/2, 100), min(n/2, 100))
			for b.Loop() {
				if r, err := FitPartitioned(context.Background(), e.partitioned(), Options{}); err != nil || r.Status != Converged {
					b.Fatal(err, r)
				}
			}
		})
	}
}
