package leastsq

import (
	"math"

	"gonum.org/v1/gonum/floats"
)

// differentiate writes the Jacobian of the whitened residuals at s.p into s.jac, with the residuals s.r there. Where
// none is given, it is a table of central differences: the simple quotient in the iteration, its refined
// limit for the covariance. One-sided quotients, half the work, were tried and lose the way on four of the ten
// certified sets.
func (s *solver) differentiate(refined bool) {
	if s.pr.Jacobian != nil {
		s.pr.Jacobian(s.jac, s.p)
		return
	}
	copy(s.probe, s.p)
	for j := range s.p {
		size := max(math.Abs(s.p[j]), s.pr.typical(j))
		down, up := s.pr.bound(j).room(s.p[j])
		if refined {
			s.extrapolate(s.hi, j, math.Pow(epsilon, 1./6)*size, down, up)
		} else {
			s.difference(s.hi, j, math.Cbrt(epsilon)*size, down, up)
		}
		for i, v := range s.hi {
			s.jac.Set(i, j, v)
		}
	}
}

// slope writes (r(p + h) - r(p))/h into dst.
func (s *solver) slope(dst []float64, j int, h float64) {
	s.at(dst, j, s.p[j]+h)
	h = s.probe[j] - s.p[j] // what the sum really added
	s.probe[j] = s.p[j]
	for i := range dst {
		dst[i] = (dst[i] - s.r[i]) / h
	}
}

// difference writes a difference quotient over a step h into dst: the central one, or where a bound leaves no room for
// that a one-sided one. It says by which power of h its error shrinks.
func (s *solver) difference(dst []float64, j int, h, down, up float64) (power float64) {
	near, far := min(down, up), max(down, up)
	if near/2 < h*1e-3 {
		h = min(h, far/2)
		if up < down {
			h = -h
		}
		s.slope(dst, j, h)
		return 1
	}
	h = min(h, near/2)
	s.at(dst, j, s.p[j]+h)
	x := s.probe[j]
	s.at(s.lo, j, s.p[j]-h)
	h = x - s.probe[j]
	s.probe[j] = s.p[j]
	for i := range dst {
		dst[i] = (dst[i] - s.lo[i]) / h
	}
	return 2
}

// extrapolate writes into dst the limit of the difference quotients over h, h/2, h/4, ... by the table of
// Ridders, "Accurate computation of F′(x) and F′(x) F″(x)", Adv. Eng. Software 4, 75 (1982), cited
// from memory: the entry that agrees best with its neighbours is kept, so that a step too large for a
// fast-varying model is cut down, and one too small for a float64 is not used.
func (s *solver) extrapolate(dst []float64, j int, h, down, up float64) {
	best := math.Inf(1)
	for row := range ridders {
		// s.table[k] holds the k-th column of the table's last row, s.next the row being made.
		power := s.difference(s.next[0], j, h, down, up)
		h /= 2
		if row == 0 {
			copy(dst, s.next[0])
		}
		grow := math.Exp2(power)
		f := grow
		for k := 1; k <= row; k++ {
			for i := range dst {
				s.next[k][i] = (f*s.next[k-1][i] - s.table[k-1][i]) / (f - 1)
			}
			f *= grow
			e := max(floats.Distance(s.next[k], s.next[k-1], 2), floats.Distance(s.next[k], s.table[k-1], 2))
			if e < best {
				best = e
				copy(dst, s.next[k])
			}
		}
		// A first step that leaves the region where the model has values makes NaNs, which no comparison favours and
		// which leave the low columns with the next row.
		size := floats.Norm(dst, 2)
		worse := row > 0 && floats.Distance(s.next[row], s.table[row-1], 2) > 2*best
		if best <= 1e-11*size || worse && best <= 1e-6*size {
			return
		}
		s.table, s.next = s.next, s.table
	}
}

// ridders is the largest number of rows of the table.
const ridders = 12

// at writes the residuals with parameter j moved to x into dst, and leaves it there in s.probe.
func (s *solver) at(dst []float64, j int, x float64) {
	s.probe[j] = x
	s.pr.Residuals(dst, s.probe)
	s.evaluations++
}
