package waveform

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// pencil finds the modes of a short series by the matrix pencil method: the samples as a Hankel matrix, of which
// the singular vectors that stand out of the noise span the modes, and the eigenvalues of that span moved on by one sample
// are e^(-d + i w). The order is the number of singular values above the noise's, at most most.
//
// Hua and Sarkar, "Matrix pencil method for estimating parameters of exponentially damped/undamped sinusoids in noise",
// IEEE Trans. Acoust., Speech, Signal Process. 38, 814 (1990), from memory.
func pencil(y []float64, most int) []mode {
	n := len(y)
	l := n / 3
	if l < 3 {
		return nil
	}
	h := mat.NewDense(n-l, l+1, nil)
	for i := range n - l {
		copy(h.RawRowView(i), y[i:i+l+1])
	}
	var svd mat.SVD
	if !svd.Factorize(h, mat.SVDThinV) {
		return nil
	}
	size := svd.Values(nil)
	var v mat.Dense
	svd.VTo(&v)
	order := min(standing(size), most, l-1)
	if order == 0 {
		return nil
	}
	first, second := v.Slice(0, l, 0, order), v.Slice(1, l+1, 0, order)
	var gram, moved mat.Dense
	gram.Mul(first.T(), first)
	moved.Mul(first.T(), second)
	var shift mat.Dense
	if err := shift.Solve(&gram, &moved); err != nil {
		return nil
	}
	var eig mat.Eigen
	if !eig.Factorize(&shift, mat.EigenNone) {
		return nil
	}
	var out []mode
	for _, z := range eig.Values(nil) {
		r, w := cmplx.Abs(z), cmplx.Phase(z)
		if w < 0 || !(r > 0) || math.IsInf(r, 0) || w > math.Pi*0.999 {
			continue // the mirror image of one with w > 0; or none at all
		}
		out = append(out, mode{-math.Log(r), w})
	}
	return out
}

// standing is how many singular values stand above the noise, of which the smaller half are a sample.
func standing(size []float64) int {
	half := size[len(size)/2:]
	squares := 0.0
	for _, s := range half {
		squares += s * s
	}
	floor := max(3*math.Sqrt(squares/float64(len(half))), 1e-9*size[0])
	n := 0
	for n < len(size)/2 && size[n] > floor {
		n++
	}
	return n
}
