package snubber

import (
	"math"
)

// modes holds the poles of a response in units of w0: a pair with s^2 + 2 sigma s + sigma^2 + q = 0, ringing
// where q > 0, and where third is set one more real pole p < 0.
//
// Every state is a combination of three functions of tau that stay smooth where poles meet:
//
//	C = exp(-sigma tau) cos(w tau)      S = exp(-sigma tau) sin(w tau)/w      q = w^2
//	G = integral from 0 to tau of S(x) exp(p (tau - x)) dx
//
// which are the divided differences of the exponential at the poles; cosh and sinh stand for cos and sin
// where q < 0. Where p stands apart from the pair (apart), G is the plain exp(p tau) instead: the same combinations, with
// nothing to cancel.
type modes struct {
	sigma, q float64
	p        float64
	third    bool
	apart    bool
}

func (m modes) wn2() float64 { return m.sigma*m.sigma + m.q }

// det is (p+sigma)^2 + q, the product of the distances of p from the two poles of the pair.
func (m modes) det() float64 { return (m.p+m.sigma)*(m.p+m.sigma) + m.q }

// series is one state: alpha C + beta S + gamma G, with the initial values it came from.
type series struct {
	alpha, beta, gamma float64
	y0, y1, y2         float64
}

// from makes the state with initial value y0 and derivatives y1 and y2 (y2 is not used in second order).
func (m modes) from(y0, y1, y2 float64) series {
	s := series{alpha: y0, beta: y1 + m.sigma*y0, y0: y0, y1: y1, y2: y2}
	if m.third {
		s.gamma = y2 + 2*m.sigma*y1 + m.wn2()*y0
	}
	if m.apart { // G = (exp(p tau) - C - (p + sigma) S)/det
		s.gamma /= m.det()
		s.alpha -= s.gamma
		s.beta -= s.gamma * (m.p + m.sigma)
	}
	return s
}

// basis is the three functions at one time.
type basis struct{ c, s, g float64 }

func (m modes) basis(tau float64) basis {
	b := basis{}
	switch {
	case m.q > 0:
		w := math.Sqrt(m.q)
		sin, cos := math.Sincos(w * tau)
		e := math.Exp(-m.sigma * tau)
		b.c, b.s = e*cos, e*sin/w
	case m.q < 0:
		// exp(-sigma tau) cosh(w tau) as two exponentials, so that neither factor overflows.
		w := math.Sqrt(-m.q)
		slow, fast := math.Exp(-m.wn2()/(m.sigma+w)*tau), math.Exp(-(m.sigma+w)*tau)
		b.c = (slow + fast) / 2
		if x := w * tau; x < 1e-3 {
			b.s = math.Exp(-m.sigma*tau) * tau * (1 + x*x/6*(1+x*x/20))
		} else {
			b.s = (slow - fast) / (2 * w)
		}
	default:
		e := math.Exp(-m.sigma * tau)
		b.c, b.s = e, e*tau
	}
	switch {
	case m.apart:
		b.g = math.Exp(m.p * tau)
	case m.third:
		b.g = m.meeting(tau)
	}
	return b
}

// near is how near the three poles must be, as det/p^2, for G to be summed as a series: told apart they lose eps/near,
// the series nothing.
const near = 1e-4

// meeting is G where the poles nearly meet.
func (m modes) meeting(tau float64) float64 {
	// exp(p tau) sum of h_k tau^(k+2)/(k+2)!, with h_k the complete homogeneous symmetric polynomials of the
	// pair's distances from p: h_k = e1 h_(k-1) - e2 h_(k-2).
	e1, e2 := -2*(m.p+m.sigma), m.det()
	h, hPrev := 1.0, 0.0
	term := tau * tau / 2
	sum := term
	for k := 1; k < 200; k++ {
		h, hPrev = e1*h-e2*hPrev, h
		term *= tau / float64(k+2)
		step := h * term
		sum += step
		if math.Abs(step) <= 1e-17*math.Abs(sum) && math.Abs(hPrev*term) <= 1e-15*math.Abs(sum) {
			break
		}
	}
	return math.Exp(m.p*tau) * sum
}

func (s series) at(b basis) float64 { return s.alpha*b.c + s.beta*b.s + s.gamma*b.g }

// slope is the derivative of s with respect to tau: C' = -sigma C - q S, S' = C - sigma S, G' = S + p G.
func (m modes) slope(s series, b basis) float64 {
	d := s.alpha*(-m.sigma*b.c-m.q*b.s) + s.beta*(b.c-m.sigma*b.s)
	switch {
	case m.apart:
		d += s.gamma * m.p * b.g
	case m.third:
		d += s.gamma * (b.s + m.p*b.g)
	}
	return d
}

// quadratic is the pair of s^2 + b s + c.
func quadratic(b, c float64) modes {
	return modes{sigma: b / 2, q: c - b*b/4}
}

// cubic splits s^3 + b s^2 + c s + d, with b, c, d > 0, into a real pole and a pair. Of three real poles it
// takes the one that stands farthest from the other two, so that poles that meet stay in the pair, whose
// functions are smooth there.
func cubic(b, c, d float64) modes {
	p := polish(realRoot(b, c, d), b, c, d)
	bq, cq := deflate(p, b, c, d)
	m := modes{sigma: bq / 2, q: cq - bq*bq/4, p: p, third: true}
	m.apart = math.Abs(m.det()) > near*p*p
	if m.q >= 0 {
		return m
	}
	w := math.Sqrt(-m.q)
	far := -(m.sigma + w)
	roots := [3]float64{p, far, cq / far}
	sort3(&roots)
	// roots[0] <= roots[1] <= roots[2]: an end is always the most isolated.
	want := roots[0]
	if roots[2]-roots[1] > roots[1]-roots[0] {
		want = roots[2]
	}
	if want != p {
		p = polish(want, b, c, d)
		bq, cq = deflate(p, b, c, d)
		m = modes{sigma: bq / 2, q: cq - bq*bq/4, p: p, third: true}
		m.apart = math.Abs(m.det()) > near*p*p
	}
	return m
}

// realRoot is one real root of s^3 + b s^2 + c s + d, by Cardano's formula or Viete's (Press et al., Numerical
// Recipes, 3rd ed., section 5.6, from memory).
func realRoot(b, c, d float64) float64 {
	q := (b*b - 3*c) / 9
	r := (2*b*b*b - 9*b*c + 27*d) / 54
	if r*r < q*q*q {
		theta := math.Acos(r / math.Sqrt(q*q*q))
		return -2*math.Sqrt(q)*math.Cos(theta/3) - b/3
	}
	u := -math.Copysign(math.Cbrt(math.Abs(r)+math.Sqrt(r*r-q*q*q)), r)
	if u == 0 {
		return -b / 3
	}
	return u + q/u - b/3
}

// polish improves a root by Newton's steps while they make the polynomial smaller.
func polish(s, b, c, d float64) float64 {
	f := ((s+b)*s+c)*s + d
	for range 8 {
		df := (3*s+2*b)*s + c
		if df == 0 || f == 0 {
			break
		}
		next := s - f/df
		fn := ((next+b)*next+c)*next + d
		if !(math.Abs(fn) < math.Abs(f)) {
			break
		}
		s, f = next, fn
	}
	return s
}

// deflate divides the root p out of s^3 + b s^2 + c s + d, leaving s^2 + bq s + cq, by whichever end of the
// division loses less.
func deflate(p, b, c, d float64) (bq, cq float64) {
	cq = -d / p
	if math.Max(b, -p) <= math.Max(cq, c)/-p {
		return b + p, cq
	}
	return (cq - c) / p, cq
}

func sort3(r *[3]float64) {
	if r[0] > r[1] {
		r[0], r[1] = r[1], r[0]
	}
	if r[1] > r[2] {
		r[1], r[2] = r[2], r[1]
	}
	if r[0] > r[1] {
		r[0], r[1] = r[1], r[0]
	}
}
