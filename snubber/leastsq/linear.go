package leastsq

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// Linear fits y = X p by weighted linear least squares: x is the design matrix, one row for each of the len(y)
// readings and one column for each parameter; u holds the readings' standard uncertainties (> 0; nil: all 1,
// and then take the result's uncertainties by Scatter).
//
// The rows are whitened, the columns brought to lengths near one by powers of two (which rounds nothing), and the
// problem is solved by Householder QR with column pivoting. The solution is refined on the augmented system
// r + X p = y, X'r = 0 with its residuals taken in twice the working precision: Björck, "Iterative
// refinement of linear least squares solutions I", BIT 7, 257 (1967), cited from memory. So the
// answer is right to nearly a float64's precision for the design as given, however nearly dependent its columns are.
//
// Where columns depend on each other (to max(m, n) times 2.2e-16 of the largest singular value), the status is
// Singular, the parameters are one of the many solutions, and Result.Blind says which combinations are free.
func Linear(x *mat.Dense, y, u []float64) (*Result, error) {
	a, b, scale, err := whiten(x, y, u)
	if err != nil {
		return nil, fmt.Errorf("linear fit: %w", err)
	}
	m, n := a.Dims()
	res := &Result{Status: Converged, Iterations: 1, Evaluations: 1, AtBound: make([]bool, n)}
	var whole mat.Dense
	whole.CloneFrom(a)
	for j := range n {
		blas64.Scal(scale[j], column(whole.RawMatrix(), j))
	}
	res.describe(&whole, float64(max(m, n))*epsilon)

	q := newOrthogonal(a, m-res.Dof)
	p, r := make([]float64, n), append([]float64(nil), b...)
	q.solve(p, r, nil)
	if len(res.Blind) == 0 {
		res.Iterations += q.refine(p, r, a, b)
	} else {
		res.Status, res.Reason = Singular, res.blindness(func(j int) string { return fmt.Sprintf("p%d", j) })
	}
	for j := range p {
		p[j] /= scale[j]
		if !finite(p[j]) {
			return nil, fmt.Errorf("linear fit: parameter %d comes out as %g: the columns and the readings differ too much in size", j, p[j])
		}
	}
	for i := range r {
		r[i] = -r[i] // model - reading, as everywhere
		res.Chi2 += r[i] * r[i]
	}
	res.P, res.Residuals = p, r
	if res.Reason == "" {
		res.Reason = "solved"
	}
	return res, nil
}

// whiten gives the design and the readings over their uncertainties, the design's columns over the powers of two in
// scale besides.
func whiten(x *mat.Dense, y, u []float64) (a *mat.Dense, b, scale []float64, err error) {
	if x == nil || x.IsEmpty() {
		return nil, nil, nil, fmt.Errorf("the design matrix is empty")
	}
	m, n := x.Dims()
	if m != len(y) {
		return nil, nil, nil, fmt.Errorf("%d rows in the design matrix for %d readings: give one row for each", m, len(y))
	}
	if m < n {
		return nil, nil, nil, fmt.Errorf("%d readings cannot tell %d parameters: take more readings or fix a parameter", m, n)
	}
	w, err := reciprocals(y, u)
	if err != nil {
		return nil, nil, nil, err
	}
	a = mat.NewDense(m, n, nil)
	b = make([]float64, m)
	for i := range m {
		b[i] = y[i] * w[i]
		for j := range n {
			v := x.At(i, j) * w[i]
			if !finite(v) {
				return nil, nil, nil, fmt.Errorf("row %d, column %d of the design matrix is %g (over its uncertainty %g): give finite numbers", i, j, x.At(i, j), v)
			}
			a.Set(i, j, v)
		}
	}
	scale = make([]float64, n)
	for j := range n {
		c := column(a.RawMatrix(), j)
		_, e := math.Frexp(blas64.Nrm2(c))
		scale[j] = math.Ldexp(1, e)
		divide(c, scale[j])
	}
	return a, b, scale, nil
}

// orthogonal is A P = Q R, of which the leading rank columns are used.
type orthogonal struct {
	qr        blas64.General
	tau, work []float64
	piv       []int
	rank      int
	h         []float64
}

func newOrthogonal(a *mat.Dense, rank int) *orthogonal {
	_, n := a.Dims()
	qr := mat.DenseCopyOf(a).RawMatrix()
	q := &orthogonal{qr: qr, rank: rank, tau: make([]float64, n), piv: make([]int, n), h: make([]float64, n), work: make([]float64, 3*n+1)}
	for j := range q.piv {
		q.piv[j] = -1
	}
	lapack64.Geqp3(qr, q.piv, q.tau, q.work, len(q.work))
	return q
}

// solve finds p and r of r + A p = f, A'r = g, with f given in r (g nil: zero).
func (q *orthogonal) solve(p, r, g []float64) {
	v := blas64.General{Rows: len(r), Cols: 1, Stride: 1, Data: r}
	lapack64.Ormqr(blas.Left, blas.Trans, q.qr, q.tau, v, q.work, len(q.work))
	clear(q.h)
	z := make([]float64, q.rank)
	if q.rank > 0 {
		t := triangle(q.qr.Data, q.rank, q.qr.Stride)
		if g != nil {
			for k := range q.rank {
				q.h[k] = g[q.piv[k]]
			}
			blas64.Trsv(blas.Trans, t, blas64.Vector{N: q.rank, Inc: 1, Data: q.h})
		}
		for k := range z {
			z[k] = r[k] - q.h[k]
			r[k] = q.h[k]
		}
		blas64.Trsv(blas.NoTrans, t, blas64.Vector{N: q.rank, Inc: 1, Data: z})
	}
	clear(p)
	for k, v := range z {
		p[q.piv[k]] = v
	}
	lapack64.Ormqr(blas.Left, blas.NoTrans, q.qr, q.tau, v, q.work, len(q.work))
}
