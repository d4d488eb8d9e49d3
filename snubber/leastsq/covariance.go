package leastsq

import (
	"fmt"
	"math"
	"strings"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// uninvolved is the part a parameter may have in a blind direction, whose length is one, and still count as told.
const uninvolved = 1e-6

// describe fills in r what the Jacobian jac of the whitened residuals (overwritten) tells of the parameters:
// covariance, degrees of freedom, condition, and the directions it is blind in.
//
// With J = Q R, R D^-1 = U S V' and D the lengths of the columns, the covariance (J'J)^-1 is
// D^-1 V S^-2 V' D^-1. Singular values below rank times the largest are left out, which gives the
// covariance of what can be told; see Result.Undetermined for what cannot.
func (r *Result) describe(jac *mat.Dense, rank float64) {
	m, n := jac.Dims()
	a := jac.RawMatrix()
	scale := make([]float64, n)
	for j := range n {
		scale[j] = blas64.Nrm2(column(a, j))
		if scale[j] == 0 {
			scale[j] = 1
		}
		divide(column(a, j), scale[j])
	}
	tau := make([]float64, n)
	work := make([]float64, n)
	lapack64.Geqrf(a, tau, work, len(work))

	tri := a
	tri.Rows = n
	for i := 1; i < n; i++ {
		clear(tri.Data[i*tri.Stride : i*tri.Stride+i])
	}
	s := make([]float64, n)
	vt := blas64.General{Rows: n, Cols: n, Stride: n, Data: make([]float64, n*n)}
	none := blas64.General{Stride: 1}
	svd := func(w []float64, lwork int) bool {
		return lapack64.Gesvd(lapack.SVDNone, lapack.SVDAll, tri, none, vt, s, w, lwork)
	}
	svd(work, -1)
	work = make([]float64, int(work[0]))
	if !svd(work, len(work)) {
		clear(s) // the QR sweeps of the SVD did not settle: nothing is known
	}

	told := 0
	for told < n && s[told] > rank*s[0] {
		told++
	}
	r.Dof = m - told
	r.Condition = math.Inf(1)
	if told == n {
		r.Condition = s[0] / s[n-1]
	}
	r.Undetermined = make([]bool, n)
	for k := told; k < n; k++ {
		blind := make([]float64, n)
		for j := range n {
			v := vt.Data[k*n+j]
			if math.Abs(v) > uninvolved {
				blind[j] = v / scale[j]
				r.Undetermined[j] = true
			}
		}
		r.Blind = append(r.Blind, blind)
	}

	r.stated = mat.NewSymDense(n, nil)
	for i := range n {
		if r.Undetermined[i] {
			r.stated.SetSym(i, i, math.Inf(1))
			continue
		}
		for j := i; j < n; j++ {
			if r.Undetermined[j] {
				continue
			}
			var sum float64
			for k := told - 1; k >= 0; k-- {
				sum += vt.Data[k*n+i] / s[k] * (vt.Data[k*n+j] / s[k])
			}
			r.stated.SetSym(i, j, sum/scale[i]/scale[j])
		}
	}
}

// blindness says in words what the readings cannot tell.
func (r *Result) blindness(name func(int) string) string {
	var all []string
	for _, d := range r.Blind {
		var parts []string
		for j, v := range d {
			if v != 0 {
				parts = append(parts, fmt.Sprintf("%+.3g in %s", v, name(j)))
			}
		}
		all = append(all, strings.Join(parts, " with "))
	}
	return "the readings cannot tell " + strings.Join(all, ", nor ") + ": fix one of these parameters or read something that moves with it"
}

func column(a blas64.General, j int) blas64.Vector {
	return blas64.Vector{N: a.Rows, Inc: a.Stride, Data: a.Data[j:]}
}

// divide divides v by s element by element: 1/s may overflow where the quotient does not.
func divide(v blas64.Vector, s float64) {
	for i := range v.N {
		v.Data[i*v.Inc] /= s
	}
}
