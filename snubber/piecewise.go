package snubber

import (
	"math"
	"math/cmplx"
)

// poles are what a linear circuit's answers are made of, in units of w0: of a pair of conjugates the upper one stands for
// both. None has a positive real part.
type poles struct {
	n int
	s [4]complex128
}

// expSum is one answer of a linear circuit as a function of time,
//
//	y(t) = c + the real part of the sum of a exp(s t)
//
// for t >= 0, in units of 1/w0. Since no pole grows, the sum of |s|^j |a exp(s t)| bounds the j-th derivative of y at t and at
// all times after: everything here that must not miss anything rests on that.
type expSum struct {
	p *poles
	c float64
	a [4]complex128
}

func (y *expSum) at(t float64) float64 {
	v := y.c
	for k := range y.p.n {
		v += real(y.a[k] * cmplx.Exp(y.p.s[k]*complex(t, 0)))
	}
	return v
}

// derivative is y'.
func (y *expSum) derivative() expSum {
	d := expSum{p: y.p}
	for k := range y.p.n {
		d.a[k] = y.a[k] * y.p.s[k]
	}
	return d
}

// envelope bounds |y - c| from t on.
func (y *expSum) envelope(t float64) float64 {
	sum := 0.0
	for k := range y.p.n {
		sum += cmplx.Abs(y.a[k]) * math.Exp(real(y.p.s[k])*t)
	}
	return sum
}

// Parts of the sum of its terms' sizes, below which y is zero, y is zero where a walk starts (at an instant found before, in
// other terms), and a derivative tells no sign.
const (
	roundedZero  = 1e-15
	roundedStart = 1e-9
	roundedSlope = 1e-10
	roundedWrong = 1e-6 // the same two where the sign to come is known
)

// maxSteps bounds the steps to one zero: some ten to a turn of the fastest pole.
const maxSteps = 1_000_000

// zero is what nextZero finds.
type zero struct {
	t     float64
	found bool
	sign  float64 // of y between from and t
	lost  bool    // maxSteps were not enough
}

// nextZero is the first zero of y after from and not after limit, a zero at from itself not counted. want is
// the sign that y is known to take after a zero at from; 0: not known.
//
// No zero is missed. Where y is v > 0 with slope g, and m bounds |y”| from there on, y stays above v + g x - m x^2/2, which is
// positive up to its root: a step to there cannot pass a zero. Near a zero the step becomes Newton's, so that the walk arrives
// as fast. A step away from a zero takes the same bound from the first derivative that is not zero there. The rule is Taylor's
// theorem; the walk is derived here.
func (y *expSum) nextZero(from, limit, want float64) zero {
	t, sign, push := from, 0.0, 0.0
	start := roundedStart
	if want != 0 {
		start = roundedWrong
	}
	for range maxSteps {
		f, g, m, size := y.c, 0.0, 0.0, math.Abs(y.c)
		var e [4]complex128
		for k := range y.p.n {
			s := y.p.s[k]
			e[k] = y.a[k] * cmplx.Exp(s*complex(t, 0))
			a, w2 := cmplx.Abs(e[k]), real(s)*real(s)+imag(s)*imag(s)
			f, g, m, size = f+real(e[k]), g+real(s*e[k]), m+w2*a, size+a
		}
		if size == 0 {
			return zero{t: limit, sign: sign}
		}
		step := 0.0
		if sign == 0 && math.Abs(f) > start*size {
			sign = math.Copysign(1, f)
		}
		if push > 0 && f*sign > 4*roundedZero*size {
			push = 0 // well away
		}
		if sign != 0 && f*sign > 0 {
			f, g := f*sign, g*sign
			root := math.Sqrt(g*g + 2*m*f)
			if g <= 0 {
				step = 2 * f / (root - g)
			} else {
				step = (g + root) / m
			}
		}
		switch near := push > 0 || f*sign <= roundedZero*size || step <= 1e-15*t; {
		case near && t > from && push == 0:
			return zero{t: t, found: true, sign: sign}
		case near: // at from, or not yet away from it
			side, far := y.p.depart(&e, want)
			if far == 0 {
				return zero{t: limit, sign: sign}
			}
			if push == 0 {
				sign = side
			}
			push = max(2*push, far)
			step = push
		}
		if t += step; !(t <= limit) {
			return zero{t: limit, sign: sign}
		}
	}
	return zero{t: t, sign: sign, lost: true}
}

// depart is the sign that a sum of terms e takes just after a zero, and a step in which it cannot come back to it.
func (p *poles) depart(e *[4]complex128, want float64) (sign, step float64) {
	d := *e
	for j := 1; j <= 5; j++ {
		f, size, next := 0.0, 0.0, 0.0
		for k := range p.n {
			d[k] *= p.s[k]
			a := cmplx.Abs(d[k])
			f, size, next = f+real(d[k]), size+a, next+a*cmplx.Abs(p.s[k])
		}
		least := roundedSlope
		if f*want < 0 {
			least = roundedWrong
		}
		if math.Abs(f) > least*size {
			return math.Copysign(1, f), float64(j+1) / 2 * math.Abs(f) / next
		}
	}
	return 0, 0
}

// visit offers the values of y at 0, at the end T where that is finite, and at every instant between at which y turns, until
// enough says of the bounds of all that follows that it can add nothing. It says whether it came to an end.
func (y *expSum) visit(T float64, enough func(least, most float64) bool, offer func(t, v float64)) bool {
	done := func(t float64) bool {
		e := y.envelope(t)
		return enough(y.c-e, y.c+e)
	}
	if done(0) {
		return true
	}
	offer(0, y.at(0))
	slope := y.derivative()
	for t := 0.0; !done(t); {
		z := slope.nextZero(t, T, 0)
		if z.lost {
			return false
		}
		if !z.found {
			break
		}
		t = z.t
		offer(t, y.at(t))
	}
	if !math.IsInf(T, 1) {
		offer(T, y.at(T))
	}
	return true
}

// grown is the integral of exp(x t) from 0 to T, with T infinite where Re x < 0.
func grown(x complex128, T float64) complex128 {
	if math.IsInf(T, 1) {
		return -1 / x
	}
	h := x * complex(T, 0)
	if cmplx.Abs(h) < 1e-3 {
		return complex(T, 0) * (1 + h/2*(1+h/3*(1+h/4*(1+h/5))))
	}
	return (cmplx.Exp(h) - 1) / x
}

// integral is that of y from 0 to T. Over an infinite time c counts as zero.
func (y *expSum) integral(T float64) float64 {
	sum := 0.0
	if !math.IsInf(T, 1) {
		sum = y.c * T
	}
	for k := range y.p.n {
		sum += real(y.a[k] * grown(y.p.s[k], T))
	}
	return sum
}

// square is the integral of y^2 from 0 to T, likewise: with Re u Re v = Re(u v + u v*)/2 a sum of exponentials again.
func (y *expSum) square(T float64) float64 {
	sum := 0.0
	if !math.IsInf(T, 1) && y.c != 0 {
		sum = y.c*y.c*T + 2*y.c*(y.integral(T)-y.c*T)
	}
	for j := range y.p.n {
		for k := range y.p.n {
			sj, sk, aj, ak := y.p.s[j], y.p.s[k], y.a[j], y.a[k]
			sum += real(aj*ak*grown(sj+sk, T)+aj*cmplx.Conj(ak)*grown(sj+cmplx.Conj(sk), T)) / 2
		}
	}
	return sum
}
