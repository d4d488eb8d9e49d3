package leastsq

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// Propagate gives the covariance of f(x) from the covariance of x (n by n) and the derivatives of f (k by n: row i
// holds d f_i / d x_j), to the first order: the law of propagation of uncertainty, JCGM 100:2008 (GUM)
// 5.2.2, equation (13), for k functions at once:
//
//	U_f = C U_x C'
//
// A variance of +Inf (a parameter nothing is known of) makes infinite the variance of every f that depends on it,
// and leaves the others alone; covariances with an infinite variance are 0. As in gonum/mat, shapes that do not fit
// are a mistake in the program, and panic with mat.ErrShape.
func Propagate(cov mat.Symmetric, jac mat.Matrix) *mat.SymDense {
	k, n := jac.Dims()
	if n != cov.SymmetricDim() {
		panic(mat.ErrShape)
	}
	half := mat.NewDense(k, n, nil) // C U_x over what is known
	unknown := make([]bool, k)
	for i := range k {
		for j := range n {
			if math.IsInf(cov.At(j, j), 1) {
				unknown[i] = unknown[i] || jac.At(i, j) != 0
				continue
			}
			var sum float64
			for l := range n {
				if !math.IsInf(cov.At(l, l), 1) {
					sum += jac.At(i, l) * cov.At(l, j)
				}
			}
			half.Set(i, j, sum)
		}
	}
	out := mat.NewSymDense(k, nil)
	for i := range k {
		if unknown[i] {
			out.SetSym(i, i, math.Inf(1))
			continue
		}
		for l := i; l < k; l++ {
			if unknown[l] {
				continue
			}
			var sum float64
			for j := range n {
				sum += half.At(i, j) * jac.At(l, j)
			}
			if i == l {
				sum = max(sum, 0) // a variance that rounding has made negative
			}
			out.SetSym(i, l, sum)
		}
	}
	return out
}
