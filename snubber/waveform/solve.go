package waveform

import "math"

// solved is the normal equations brought to triangular form by Cholesky's method, each column first scaled to length 1.
// The values' columns stand first, so the triangle's head solves the model with d and w held, and the whole of it the model
// in which they move: one factorisation gives the residual of the one and the step of the other.
type solved struct {
	*sums
	scale [maxColumns]float64
	low   [maxColumns][maxColumns]float64
	z     [maxColumns]float64
}

// solve fails where two columns are too alike to tell apart.
func (s *sums) solve() (*solved, bool) {
	f := &solved{sums: s}
	for i := range s.columns {
		if !(s.gram[i][i] > 0) || math.IsInf(s.gram[i][i], 0) {
			return nil, false
		}
		f.scale[i] = 1 / math.Sqrt(s.gram[i][i])
	}
	for i := range s.columns {
		for j := range i + 1 {
			v := s.gram[i][j] * f.scale[i] * f.scale[j]
			for k := range j {
				v -= f.low[i][k] * f.low[j][k]
			}
			if i == j {
				if v < 1e-13 { // some thousand times the rounding of a product of columns
					return nil, false
				}
				f.low[i][i] = math.Sqrt(v)
			} else {
				f.low[i][j] = v / f.low[j][j]
			}
		}
	}
	for i := range s.columns {
		v := s.with[i] * f.scale[i]
		for k := range i {
			v -= f.low[i][k] * f.z[k]
		}
		f.z[i] = v / f.low[i][i]
	}
	return f, true
}

// rss is the sum of squared residuals with d and w held.
func (f *solved) rss() float64 {
	r := f.yy
	for _, z := range f.z[:f.values] {
		r -= z * z
	}
	return max(r, 0)
}

// coefficients of the first k columns: values for the model with d and w held, columns for all.
func (f *solved) coefficients(k int) (x [maxColumns]float64) {
	for i := k - 1; i >= 0; i-- {
		v := f.z[i]
		for j := i + 1; j < k; j++ {
			v -= f.low[j][i] * x[j]
		}
		x[i] = v / f.low[i][i]
	}
	for i := range k {
		x[i] *= f.scale[i]
	}
	return x
}

// inverse of the Gram matrix: times the noise's variance, the covariance of all coefficients.
func (f *solved) inverse() (c [maxColumns][maxColumns]float64) {
	n := f.columns
	var inv [maxColumns][maxColumns]float64 // of the triangle
	for i := range n {
		inv[i][i] = 1 / f.low[i][i]
		for j := range i {
			v := 0.0
			for k := j; k < i; k++ {
				v -= f.low[i][k] * inv[k][j]
			}
			inv[i][j] = v / f.low[i][i]
		}
	}
	for i := range n {
		for j := range n {
			v := 0.0
			for k := max(i, j); k < n; k++ {
				v += inv[k][i] * inv[k][j]
			}
			c[i][j] = v * f.scale[i] * f.scale[j]
		}
	}
	return c
}
