package leastsq

import (
	"math"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// refine improves the least-squares solution p, r of A p + r = b until the corrections to p no longer shrink, and
// gives the number of corrections made.
func (q *orthogonal) refine(p, r []float64, a *mat.Dense, b []float64) int {
	m, n := a.Dims()
	dp, dr, g := make([]float64, n), make([]float64, m), make([]float64, n)
	last := math.Inf(1)
	for k := range 20 {
		for i := range m {
			var s double
			s.add(b[i])
			s.add(-r[i])
			for j := range n {
				s.addProduct(-a.At(i, j), p[j])
			}
			dr[i] = s.value()
		}
		for j := range n {
			var s double
			for i := range m {
				s.addProduct(-a.At(i, j), r[i])
			}
			g[j] = s.value()
		}
		q.solve(dp, dr, g)
		var size float64 // of the largest correction, as a part of its parameter
		for j := range n {
			if p[j] != 0 {
				size = max(size, math.Abs(dp[j]/p[j]))
			}
		}
		if !(size <= last/2) {
			return k
		}
		last = size
		floats.Add(p, dp)
		floats.Add(r, dr)
		if size <= epsilon/2 {
			return k + 1
		}
	}
	return 20
}

// double is a sum kept in twice the working precision, as hi + lo: Dekker, "A floating-point technique for
// extending the available precision", Numer. Math. 18, 224 (1971), cited from memory; the product's rounding error
// comes from a fused multiply-add.
type double struct{ hi, lo float64 }

func (d *double) add(x float64) {
	s := d.hi + x
	t := s - d.hi
	d.lo += (d.hi - (s - t)) + (x - t)
	d.hi = s
}

func (d *double) addProduct(x, y float64) {
	p := x * y
	d.add(p)
	d.lo += math.FMA(x, y, -p)
}

func (d *double) value() float64 { return d.hi + d.lo }
