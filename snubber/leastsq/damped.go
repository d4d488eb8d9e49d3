package leastsq

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// linearised is the least-squares problem linearised about the iteration's point, J d = -r, in the scaled
// unknown z = D d, factored as J D^-1 P = Q R with column pivoting (P).
type linearised struct {
	n     int
	rank  int       // the leading columns of R that stand out of the rounding
	r     []float64 // R, n by n, row-major
	c     []float64 // the leading n elements of Q'r
	piv   []int     // column of J that the k-th column of R came from
	scale []float64 // D: the largest length each column of J has had (More 1978)

	step []float64 // the last step found: d, in the order of the parameters
	z    []float64 // the same, scaled and pivoted

	q     blas64.General // Q in the form of its reflections, of scalars tau
	tau   []float64
	stack blas64.General // R above sqrt(mu), then their own triangular factor, and the scalars of its reflections
	tau2  []float64
	rhs   blas64.General
	work  []float64
}

func newLinearised(n int) *linearised {
	f := make([]float64, n*n+6*n+2*n*n+2*n)
	take := func(k int) []float64 { v := f[:k:k]; f = f[k:]; return v }
	l := &linearised{
		n: n, r: take(n * n), c: take(n), scale: take(n), step: take(n), z: take(n), tau: take(n), tau2: take(n),
		piv:   make([]int, n),
		stack: blas64.General{Rows: 2 * n, Cols: n, Stride: n, Data: take(2 * n * n)},
		rhs:   blas64.General{Rows: 2 * n, Cols: 1, Stride: 1, Data: take(2 * n)},
	}
	// The least the routines ask for: their blocked forms, which want more, gain nothing on a few columns.
	l.work = make([]float64, 3*n+1)
	return l
}

// factor takes in the Jacobian and the residuals at a new point; it overwrites both, and keeps the first. A diagonal
// element of R below tol times the length of its column counts as zero.
func (l *linearised) factor(jac, res blas64.General, tol float64) {
	n := l.n
	for j := range n {
		length := blas64.Nrm2(column(jac, j))
		l.scale[j] = max(l.scale[j], length)
		if l.scale[j] > 0 {
			divide(column(jac, j), l.scale[j])
		}
		l.piv[j] = -1 // free to move
	}
	lapack64.Geqp3(jac, l.piv, l.tau, l.work, len(l.work))
	lapack64.Ormqr(blas.Left, blas.Trans, jac, l.tau, res, l.work, len(l.work))
	for i := range n {
		copy(l.r[i*n+i:(i+1)*n], jac.Data[i*jac.Stride+i:i*jac.Stride+n])
	}
	copy(l.c, res.Data[:n])
	l.q = jac
	l.rank = 0
	for l.rank < n && math.Abs(l.r[l.rank*n+l.rank]) >
		tol*blas64.Nrm2(blas64.Vector{N: l.rank + 1, Inc: n, Data: l.r[l.rank:]}) {
		l.rank++
	}
}

// projection is the length of the residuals' projection on the range of the Jacobian.
func (l *linearised) projection() float64 {
	return blas64.Nrm2(blas64.Vector{N: l.rank, Inc: 1, Data: l.c})
}

// gaussNewton finds the undamped step, with zero for the parameters whose columns add nothing to the others'.
func (l *linearised) gaussNewton() {
	clear(l.z)
	for i := range l.rank {
		l.z[i] = -l.c[i]
	}
	if l.rank > 0 {
		blas64.Trsv(blas.NoTrans, triangle(l.r, l.rank, l.n), blas64.Vector{N: l.rank, Inc: 1, Data: l.z})
	}
	l.unpivot()
}

// damped finds the step that minimises |J d + r|^2 + mu |D d|^2.
func (l *linearised) damped(mu float64) {
	n := l.n
	copy(l.stack.Data, l.r)
	clear(l.stack.Data[n*n:])
	root := math.Sqrt(mu)
	clear(l.rhs.Data)
	for i := range n {
		l.stack.Data[(n+i)*n+i] = root
		l.rhs.Data[i] = -l.c[i]
	}
	lapack64.Geqrf(l.stack, l.tau2, l.work, len(l.work))
	l.solve()
	copy(l.z, l.rhs.Data[:n])
	l.unpivot()
}

// solve replaces l.rhs by the solution of the damped system, whose factors damped has left in l.stack.
func (l *linearised) solve() {
	lapack64.Ormqr(blas.Left, blas.Trans, l.stack, l.tau2, l.rhs, l.work, len(l.work))
	blas64.Trsv(blas.NoTrans, triangle(l.stack.Data, l.n, l.n), blas64.Vector{N: l.n, Inc: 1, Data: l.rhs.Data})
}

// along writes J d of the last step into dst.
func (l *linearised) along(dst blas64.General) {
	clear(dst.Data)
	copy(dst.Data, l.z)
	blas64.Trmv(blas.NoTrans, triangle(l.r, l.n, l.n), blas64.Vector{N: l.n, Inc: 1, Data: dst.Data})
	lapack64.Ormqr(blas.Left, blas.NoTrans, l.q, l.tau, dst, l.work, len(l.work))
}

// accelerate adds to the step of damped half the geodesic acceleration, the damped solution for the second
// derivative curve of the residuals along the step (overwritten), and gives the length of what it added.
func (l *linearised) accelerate(curve blas64.General) float64 {
	lapack64.Ormqr(blas.Left, blas.Trans, l.q, l.tau, curve, l.work, len(l.work))
	clear(l.rhs.Data)
	for i := range l.n {
		l.rhs.Data[i] = -curve.Data[i] / 2
	}
	l.solve()
	a := blas64.Vector{N: l.n, Inc: 1, Data: l.rhs.Data}
	blas64.Axpy(1, a, blas64.Vector{N: l.n, Inc: 1, Data: l.z})
	l.unpivot()
	return blas64.Nrm2(a)
}

func triangle(data []float64, n, stride int) blas64.Triangular {
	return blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: n, Stride: stride, Data: data}
}

func (l *linearised) unpivot() {
	for k, j := range l.piv {
		l.step[j] = 0
		if l.scale[j] > 0 {
			l.step[j] = l.z[k] / l.scale[j]
		}
	}
}

// length is |D d| of the last step.
func (l *linearised) length() float64 { return blas64.Nrm2(blas64.Vector{N: l.n, Inc: 1, Data: l.z}) }

// predicted is the fall of |r|^2 that the linearised problem promises for the last step, taken with damping mu:
// |R z|^2 + 2 mu |z|^2.
func (l *linearised) predicted(mu float64) float64 {
	copy(l.rhs.Data, l.z)
	v := blas64.Vector{N: l.n, Inc: 1, Data: l.rhs.Data}
	blas64.Trmv(blas.NoTrans, triangle(l.r, l.n, l.n), v)
	a, b := blas64.Nrm2(v), l.length()
	return a*a + 2*mu*b*b
}
