package snubber

import (
	"math"
	"math/cmplx"
)

// Effects beyond the linear loop with ideal parts, which the fit tries where the data demand them.
type effect int

const (
	fallTime  effect = iota // the switch's current falls linearly in a finite time
	lead                    // the added capacitor's leads have inductance
	junction                // the node's capacitance falls with its voltage
	noEffects               // how many there are
)

// effectName says what an effect is, for the result.
func (e effect) String() string {
	switch e {
	case fallTime:
		return "the switch current's fall time"
	case lead:
		return "the series inductance of the added capacitors' leads"
	case junction:
		return "a node capacitance that falls with voltage"
	}
	return "unknown"
}

// The junction effect is one parameter, the share of the node's capacitance that is a depletion capacitance of grading
// exponent 1/2 (Sze and Ng, Physics of Semiconductor Devices, 3rd ed. 2007, chapter 2, from memory) with a built-in
// potential small against the bus. What the ring sees of it is its describing function for a swing of amplitude A about
// the bus E, the mean of C(E + A cos x) weighted by sin^2 x (Gelb and Vander Velde, Multiple-Input Describing Functions,
// 1968, from memory). The peak is reached with the whole first swing; a frequency is read over a ring that dies away, which
// counts as half of it.
const (
	builtIn  = 0.02 // of the reference bus
	ringPart = 0.5  // of the first swing's amplitude, for what is read of the ring
)

// junctionFactor is C as a swing of amplitude a about bus e sees it, over C at rest at bus ref, for the share s.
func junctionFactor(s, e, a, ref float64) float64 {
	const n = 12
	sum := 0.0
	for k := 1; k <= n; k++ { // Gauss and Chebyshev's quadrature of the second kind
		sin, cos := math.Sincos(math.Pi * float64(k) / (n + 1))
		v := math.Max(e+a*cos, 0)
		sum += sin * sin * math.Sqrt((1+builtIn)*ref/(v+builtIn*ref))
	}
	return 1 + s*(sum*2/(n+1)-1)
}

// extended are the signs of a circuit with effects, the peak's only where it is wanted. Where fixed is not negative, the
// third sign is the node's voltage then and not the peak.
func (v *circuitValues) extended(wantPeak bool, fixed float64) (s [3]float64, when float64) {
	ring, top := *v, *v
	if v[atShare] > 0 && v[atE] > 0 {
		own := v[atC] - v[atProbe]
		whole := v.swing()
		ring[atC] = own*junctionFactor(v[atShare], v[atE], ringPart*whole, v[atRef]) + v[atProbe]
		top[atC] = own*junctionFactor(v[atShare], v[atE], whole, v[atRef]) + v[atProbe]
	}
	if v[atLead] == 0 {
		r := ring.respond()
		s[ringAt], s[decayAt] = r.ringSigns()
		if !wantPeak {
			return s, math.Inf(1)
		}
		if fixed >= 0 {
			s[peakAt] = newFalling(&top).at(fixed)
			return s, fixed
		}
		when, s[peakAt] = newFalling(&top).peak()
		return s, when
	}
	poles := ring.poleSum()
	s[ringAt], s[decayAt] = poles.ringSigns()
	if !wantPeak {
		return s, math.Inf(1)
	}
	if top != ring {
		poles = top.poleSum()
	}
	if fixed >= 0 {
		s[peakAt] = poles.at(fixed)
		return s, fixed
	}
	when, s[peakAt] = poles.peak()
	return s, when
}

// swing is the amplitude of the first swing about the bus, V: that of the loop alone with all the capacitance, without
// loss.
func (v *circuitValues) swing() float64 {
	return math.Hypot(v[atE], v[atI0]*math.Sqrt(v[atL]/(v[atC]+v[atCs])))
}

// poleSum is a response as a sum over its poles,
//
//	v(t) = settled + real part of the sum of a exp(s t)
//
// with one set of amplitudes while the switch's current falls and another after. Of a pair of conjugate poles one stands
// for both. It serves where the leads add a fourth pole; where poles meet it loses digits, which a fit can spare.
type poleSum struct {
	n       int
	s       [4]complex128 // 1/s
	during  amplitudes    // while the current falls
	after   amplitudes
	fall    float64 // s
	ringing int     // index of the pole that rings; -1: none
	slow    float64 // 1/s: decay of the slowest pole
	fast    float64 // 1/s: size of the fastest
}

type amplitudes struct {
	settled float64 // V
	a       [4]complex128
}

// poleSum finds the poles and amplitudes. With q = 1 + s Rs Cs + s^2 Ls Cs,
//
//	D(s) = q + (s L + r)(s C q + s Cs)
//
// is the characteristic polynomial, and the node's voltage after a step of the bus E and of the current I0
//
//	(E + s L I0) q/(s D(s))
//
// in the Laplace transform; a current that falls in tf is the mean of steps over that time.
func (v *circuitValues) poleSum() *poleSum {
	p := &poleSum{fall: v[atFall], ringing: -1, slow: math.Inf(1)}
	l, c, r, cs, rs, ls := v[atL], v[atC], v[atR], v[atCs], v[atRs], v[atLead]
	if cs == 0 {
		rs, ls = 0, 0
	}
	w, z := 1/math.Sqrt(l*c), math.Sqrt(l/c)
	q := [3]float64{1, rs * cs * w, ls * cs * w * w} // in the unknown s/w0
	in := [2]float64{r / z, 1}                       // (s L + r)/Z0
	y := [4]float64{0, 1 + cs/c, q[1], q[2]}         // (s C q + s Cs) Z0
	d := [5]float64{q[0], q[1], q[2]}
	for i, a := range in {
		for j, b := range y {
			d[i+j] += a * b
		}
	}
	n := 4
	for n > 2 && d[n] <= 1e-12*d[n-1] {
		n--
	}
	p.during.settled, p.after.settled = v[atE], v[atE]
	found, ok := polesOf(d[:n+1])
	if !ok {
		return p // not the poles of a circuit; whoever asked refuses what comes of it
	}
	for _, s := range found.s[:found.n] {
		p.slow, p.fast = math.Min(p.slow, -real(s)*w), math.Max(p.fast, cmplx.Abs(s)*w)
		weight := complex(2, 0) // for its conjugate
		switch im := imag(s); {
		case math.Abs(im) <= 1e-9:
			weight = 1
		default:
			// The ring is the slower of two pairs in frequency: the other is the leads'.
			if p.ringing < 0 || im*w < imag(p.s[p.ringing]) {
				p.ringing = p.n
			}
		}
		num := complex(q[0], 0) + s*(complex(q[1], 0)+s*complex(q[2], 0))
		slope := complex(0, 0)
		for m := n; m >= 1; m-- {
			slope = slope*s + complex(float64(m)*d[m], 0)
		}
		bus := weight * complex(v[atE], 0) * num / (s * slope)
		amps := weight * complex(v[atI0]*z, 0) * num / slope
		p.s[p.n] = s * complex(w, 0)
		if p.fall == 0 {
			p.after.a[p.n] = bus + amps
		} else {
			x := p.s[p.n] * complex(p.fall, 0)
			p.during.a[p.n] = bus + amps/x
			p.during.settled -= real(amps / x)
			p.after.a[p.n] = bus + amps/x*(1-cmplx.Exp(-x))
		}
		p.n++
	}
	return p
}

func (p *poleSum) ringSigns() (hz, decay float64) {
	if p.ringing < 0 {
		return 0, 1 / p.slow
	}
	s := p.s[p.ringing]
	return imag(s) / (2 * math.Pi), -1 / real(s)
}

func (p *poleSum) amplitudes(t float64) *amplitudes {
	if t < p.fall {
		return &p.during
	}
	return &p.after
}

// at is the node's voltage at time t, V.
func (p *poleSum) at(t float64) float64 {
	x := p.amplitudes(t)
	v := x.settled
	for k := range p.n {
		v += real(x.a[k] * cmplx.Exp(p.s[k]*complex(t, 0)))
	}
	return v
}

// slope is the derivative of the node's voltage at time t, V/s.
func (p *poleSum) slope(t float64) float64 {
	x := p.amplitudes(t)
	sum := 0.0
	for k := range p.n {
		sum += real(p.s[k] * x.a[k] * cmplx.Exp(p.s[k]*complex(t, 0)))
	}
	return sum
}

// peak is the highest voltage: that of the first ring and a half, walked in steps a sixteenth of the fastest pole's. The
// exponentials are carried from step to step; each top is then found exactly.
func (p *poleSum) peak() (when, volts float64) {
	when, volts = math.Inf(1), p.after.settled
	end := p.fall + 60/p.slow
	if p.ringing >= 0 {
		end = math.Min(end, p.fall+2*math.Pi/imag(p.s[p.ringing])*1.5)
	}
	if !(end > 0) || math.IsInf(end, 1) || !(p.fast > 0) {
		return when, volts // not the poles of a circuit; whoever asked will refuse the rest too
	}
	step := math.Max(2*math.Pi/p.fast/16, end/4000)
	var ex, turn [4]complex128
	for k := range p.n {
		ex[k], turn[k] = 1, cmplx.Exp(p.s[k]*complex(step, 0))
	}
	b := p.slope(0)
	v := p.at(0)
	for hi := step; hi <= end+step; hi += step {
		a, from := b, v
		x := p.amplitudes(hi)
		b, v = 0, x.settled
		for k := range p.n {
			ex[k] *= turn[k]
			y := x.a[k] * ex[k]
			b += real(p.s[k] * y)
			v += real(y)
		}
		// Between two grid points the slope hardly grows beyond what it is at their ends.
		if a <= 0 || b > 0 || from+2*a*step < volts {
			continue
		}
		if t := crossing(hi-step, hi, a, b, p.slope); p.at(t) > volts {
			when, volts = t, p.at(t)
		}
	}
	return when, volts
}
