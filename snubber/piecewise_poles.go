package snubber

import (
	"math"
	"math/cmplx"
)

// polesOf finds the poles of a circuit from its characteristic polynomial d, lowest coefficient first, of degree two to four
// with all coefficients positive (or zero at order one). Quadratic and cubic are those of modes.go; ok is false where a
// quartic's poles meet so closely that pairs cannot be told from single ones.
func polesOf(d []float64) (p poles, ok bool) {
	n := len(d) - 1
	for n > 2 && d[n] == 0 {
		n--
	}
	if n == 4 {
		return quarticPoles(d)
	}
	var m modes
	if n == 3 {
		m = cubic(d[2]/d[3], d[1]/d[3], d[0]/d[3])
	} else {
		m = quadratic(d[1]/d[2], d[0]/d[2])
	}
	add := func(s complex128) { p.s[p.n] = s; p.n++ }
	if m.q > 0 {
		add(complex(-m.sigma, math.Sqrt(m.q)))
	} else {
		fast := m.sigma + math.Sqrt(-m.q)
		add(complex(-m.wn2()/fast, 0)) // the product of the two does not cancel
		add(complex(-fast, 0))
	}
	if m.third {
		add(complex(m.p, 0))
	}
	return p, true
}

// quarticPoles iterates on all four roots at once (Aberth, Math. Comp. 27, 339, 1973, from memory) from moduli that the
// corners of Newton's polygon give (Bini, Numerical Algorithms 13, 179, 1996, from memory), so that poles far apart start
// far apart.
func quarticPoles(d []float64) (p poles, ok bool) {
	s := polygonStart(d)
	for range 100 {
		moved := 0.0
		for k := range s {
			f, df := evaluate(d, s[k])
			if f == 0 {
				continue
			}
			sum := complex(0, 0)
			for j := range s {
				if j != k {
					sum += 1 / (s[k] - s[j])
				}
			}
			ratio := f / df
			step := ratio / (1 - ratio*sum)
			if cmplx.IsNaN(step) || cmplx.IsInf(step) {
				return p, false
			}
			s[k] -= step
			moved = math.Max(moved, cmplx.Abs(step)/cmplx.Abs(s[k]))
		}
		if moved < 1e-15 {
			break
		}
	}
	count := 0
	for _, x := range s {
		switch im := imag(x); {
		case math.Abs(im) <= 1e-11*cmplx.Abs(x):
			p.s[p.n] = complex(real(x), 0)
			count++
		case im < 0:
			continue
		default:
			p.s[p.n] = complex(math.Min(real(x), 0), im)
			count += 2
		}
		p.n++
	}
	return p, count == 4
}

func evaluate(d []float64, x complex128) (f, df complex128) {
	for m := len(d) - 1; m >= 0; m-- {
		df = df*x + f
		f = f*x + complex(d[m], 0)
	}
	return f, df
}

func polygonStart(d []float64) []complex128 {
	n := len(d) - 1
	s := make([]complex128, 0, 4)
	for i := 0; i < n; {
		// The next corner of the upper hull of (k, log d[k]): the one seen from i under the steepest angle.
		next, steepest := i+1, math.Inf(-1)
		for k := i + 1; k <= n; k++ {
			if slope := (math.Log(d[k]) - math.Log(d[i])) / float64(k-i); slope >= steepest {
				next, steepest = k, slope
			}
		}
		for k := i; k < next; k++ {
			angle := math.Pi/2 + 0.4 + 2*math.Pi*float64(k-i)/float64(next-i) + 0.3*float64(i)
			s = append(s, cmplx.Rect(math.Exp(-steepest), angle))
		}
		i = next
	}
	return s
}
