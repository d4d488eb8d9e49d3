package snubber

import "math"

// Peak is the highest voltage of the node and when it is reached.
type Peak struct {
	Volts float64 // V
	At    float64 // s after the switch lets go; +Inf where the node only creeps up to the bus
}

// Peak finds the highest voltage of the node on the closed form.
//
// It is exact, not a sampled maximum: with f the slope of the node's voltage and p the real pole, f' - p f is
// free of the real pole, a bare damped sinusoid g whose zeros are known. Since (exp(-p t) f)' = exp(-p t) g, the
// product exp(-p t) f is monotone from one zero of g to the next and f has at most one zero between them: each
// is bracketed by two signs and found by Newton's steps. The search ends where the envelope of what is to come
// lies below what was found. Derived here.
func (r Response) Peak() Peak {
	best := Peak{Volts: r.bus, At: math.Inf(1)}
	if r.bus == 0 && r.node.y1 == 0 {
		return Peak{}
	}
	offer := func(tau float64) {
		if v := r.bus + r.node.at(r.modes.basis(tau)); v > best.Volts {
			best = Peak{Volts: v, At: tau / r.w0}
		}
	}
	if !r.modes.third {
		// Second order: the slope is itself the damped sinusoid, and its first zero after a rise is the peak.
		if tau, ok := r.modes.firstZero(r.node.y1, r.modes.slope0(r.node)); ok {
			offer(tau)
		}
		return best
	}
	r.turns(offer, func(tau float64) bool { return r.envelope(tau) < best.Volts-r.bus })
	return best
}

// maxTurns bounds the zeros of g that are looked at: an undamped ring has no end.
const maxTurns = 1000

// turns calls offer for each instant at which the node's voltage stops rising, until done says that nothing
// higher can follow.
func (r Response) turns(offer func(tau float64), done func(tau float64) bool) {
	m, s := r.modes, r.node
	// g and its slope at 0; the slope from the characteristic polynomial, which leaves what does not cancel.
	g0 := s.y2 - m.p*s.y1
	tau, ok := m.firstZero(g0, -2*m.sigma*g0-m.wn2()*(s.y1-m.p*s.y0))
	slow := math.Min(-m.p, m.slowest())
	from := 0.0
	before := s.y1 // the slope where the stretch begins; E > 0 or I0 > 0, so that the node starts upwards
	rising := true
	for n := 0; n < maxTurns; n++ {
		to := tau
		// No further zero of g, or one so late that all has died away (60 time constants): the last stretch.
		if late := from + 60/slow; !ok || to > late {
			to, ok = late, false
		}
		after := m.slope(s, m.basis(to))
		falls := after < 0
		if rising && falls {
			offer(m.turn(s, from, to, before, after))
		}
		rising, before = !falls, after
		if !ok || done(to) {
			return
		}
		from = to
		if m.q > 0 {
			tau += math.Pi / math.Sqrt(m.q)
		} else {
			ok = false
		}
	}
}

// turn is the one zero of the slope of s in [lo, hi], where it has the values a >= 0 and b < 0.
func (m modes) turn(s series, lo, hi, a, b float64) float64 {
	tau := (lo + hi) / 2
	// In a short stretch the chord is the better start; in a long one the slope has all but died away at its end.
	if 5*-b > a && a > 0 {
		tau = lo + (hi-lo)*a/(a-b)
	}
	for range 100 {
		b := m.basis(tau)
		f := m.slope(s, b)
		if f > 0 {
			lo = tau
		} else {
			hi = tau
		}
		// f' from the third-order equation: y'' in the basis.
		next := tau - f/m.bend(s, b)
		if !(next > lo && next < hi) {
			next = (lo + hi) / 2
		}
		// Newton's error squares from step to step: what is left after a step this small is rounding.
		small := math.Abs(next-tau) <= 1e-8*tau
		tau = next
		if small {
			break
		}
	}
	return tau
}

// bend is the second derivative of s with respect to tau.
func (m modes) bend(s series, b basis) float64 {
	c1, s1 := -m.sigma*b.c-m.q*b.s, b.c-m.sigma*b.s
	d := s.alpha*(-m.sigma*c1-m.q*s1) + s.beta*(c1-m.sigma*s1)
	switch {
	case m.apart:
		d += s.gamma * m.p * m.p * b.g
	case m.third:
		d += s.gamma * (s1 + m.p*(b.s+m.p*b.g))
	}
	return d
}

// slope0 is the second derivative of s at 0 in second order: y” = -2 sigma y' - wn^2 y.
func (m modes) slope0(s series) float64 { return -2*m.sigma*s.y1 - m.wn2()*s.y0 }

// firstZero is the first tau > 0 at which g(0) (C + sigma S) + g'(0) S vanishes.
func (m modes) firstZero(g0, g1 float64) (tau float64, ok bool) {
	h := g1 + m.sigma*g0
	switch {
	case g0 == 0 && h == 0:
		return 0, false
	case m.q > 0:
		w := math.Sqrt(m.q)
		a := math.Atan2(-g0*w, h)
		if a <= 0 {
			a += math.Pi
		}
		return a / w, true
	case m.q < 0:
		w := math.Sqrt(-m.q)
		x := -g0 * w / h
		if !(x > 0 && x < 1) {
			return 0, false
		}
		return math.Atanh(x) / w, true
	default:
		tau = -g0 / h
		return tau, tau > 0
	}
}

// slowest is the decay rate of the slower pole of the pair.
func (m modes) slowest() float64 {
	if m.q >= 0 {
		return m.sigma
	}
	return m.wn2() / (m.sigma + math.Sqrt(-m.q))
}

// envelope bounds d from tau on. Where the poles meet it is +Inf: no bound is at hand, and few turns are left.
func (r Response) envelope(tau float64) float64 {
	m, s := r.modes, r.node
	if m.q <= 0 || !m.apart {
		return math.Inf(1)
	}
	return math.Max(s.gamma, 0)*math.Exp(m.p*tau) + math.Sqrt(s.alpha*s.alpha+s.beta*s.beta/m.q)*math.Exp(-m.sigma*tau)
}
