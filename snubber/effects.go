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

// poleSum is a response as a sum over its poles: the node's voltage after a step of the bus and after a step of the
// current,
//
//	E (1 + sum e exp(s t)) + I0 sum i exp(s t)
//
// the latter averaged over the time in which the current falls. It serves where the leads add a fourth pole; where poles
// meet it loses digits, which a fit can spare.
type poleSum struct {
	n          int
	s, e, i    [4]complex128
	bus, amps  float64
	fall       float64 // s
	ringing    int     // index of the pole that rings; -1: none
	slow, fast float64 // 1/s: decay of the slowest pole, and size of the fastest
}

func (v *circuitValues) poleSum() *poleSum {
	p := &poleSum{bus: v[atE], amps: v[atI0], fall: v[atFall], ringing: -1}
	l, c, r, cs, rs, ls := v[atL], v[atC], v[atR], v[atCs], v[atRs], v[atLead]
	if cs == 0 {
		rs, ls = 0, 0
	}
	// D(s) = q + (s L + r)(s C q + s Cs) with q = 1 + s Rs Cs + s^2 Ls Cs, in the unknown s/w0.
	w := 1 / math.Sqrt(l*c)
	z := l * w
	q := [3]float64{1, rs * cs * w, ls * cs * w * w}
	in := [2]float64{r / z, 1}               // (s L + r)/Z0
	y := [4]float64{0, 1 + cs/c, q[1], q[2]} // (s C q + s Cs) Z0
	d := [5]float64{q[0], q[1], q[2]}
	for i, a := range in {
		for j, b := range y {
			d[i+j] += a * b
		}
	}
	p.n = 4
	for p.n > 2 && d[p.n] <= 1e-12*d[p.n-1] {
		p.n--
	}
	p.roots(d[:p.n+1])
	for k := range p.n {
		s := p.s[k]
		num := complex(q[0], 0) + s*(complex(q[1], 0)+s*complex(q[2], 0))
		slope := complex(0, 0)
		for m := p.n; m >= 1; m-- {
			slope = slope*s + complex(float64(m)*d[m], 0)
		}
		p.e[k] = num / (s * slope)
		p.i[k] = complex(z, 0) * num / slope
		p.s[k] = s * complex(w, 0)
	}
	p.slow = math.Inf(1)
	for k := range p.n {
		p.slow = math.Min(p.slow, -real(p.s[k]))
		p.fast = math.Max(p.fast, cmplx.Abs(p.s[k]))
		if im := imag(p.s[k]); im > 1e-9*w {
			// The ring is the slower of two pairs in frequency: the other is the leads'.
			if p.ringing < 0 || im < imag(p.s[p.ringing]) {
				p.ringing = k
			}
		}
	}
	return p
}

// roots finds the roots of the polynomial d by the simultaneous iteration of Aberth (Math. Comp. 27, 339, 1973, from
// memory).
func (p *poleSum) roots(d []float64) {
	n := len(d) - 1
	bound := 0.0
	for k := range n {
		bound = math.Max(bound, math.Pow(math.Abs(d[k]/d[n]), 1/float64(n-k)))
	}
	for k := range n {
		p.s[k] = cmplx.Rect(bound*(0.4+0.3*float64(k)/float64(n)), math.Pi/2+0.3+2*math.Pi*float64(k)/float64(n))
	}
	for range 60 {
		moved := 0.0
		for k := range n {
			f, df := complex(0, 0), complex(0, 0)
			for m := n; m >= 0; m-- {
				df = df*p.s[k] + f
				f = f*p.s[k] + complex(d[m], 0)
			}
			if f == 0 {
				continue
			}
			ratio := f / df
			sum := complex(0, 0)
			for j := range n {
				if j != k {
					sum += 1 / (p.s[k] - p.s[j])
				}
			}
			step := ratio / (1 - ratio*sum)
			p.s[k] -= step
			moved = math.Max(moved, cmplx.Abs(step)/cmplx.Abs(p.s[k]))
		}
		if moved < 1e-15 {
			break
		}
	}
}

func (p *poleSum) ringSigns() (hz, decay float64) {
	if p.ringing < 0 {
		return 0, 1 / p.slow
	}
	s := p.s[p.ringing]
	return imag(s) / (2 * math.Pi), -1 / real(s)
}

// at is the node's voltage at time t, V.
func (p *poleSum) at(t float64) float64 {
	v := p.bus
	for k := range p.n {
		s := p.s[k]
		ex := cmplx.Exp(s * complex(t, 0))
		v += real(complex(p.bus, 0) * p.e[k] * ex)
		i := complex(p.amps, 0) * p.i[k]
		if p.fall == 0 {
			v += real(i * ex)
		} else {
			v += real(i / (s * complex(p.fall, 0)) * (ex - p.before(s, t)))
		}
	}
	return v
}

// before is exp(s (t - fall)), and 1 while the current still falls.
func (p *poleSum) before(s complex128, t float64) complex128 {
	if t <= p.fall {
		return 1
	}
	return cmplx.Exp(s * complex(t-p.fall, 0))
}

// slope is the derivative of the node's voltage at time t, V/s.
func (p *poleSum) slope(t float64) float64 {
	sum := 0.0
	for k := range p.n {
		s := p.s[k]
		ex := cmplx.Exp(s * complex(t, 0))
		sum += real(s * complex(p.bus, 0) * p.e[k] * ex)
		i := complex(p.amps, 0) * p.i[k]
		switch {
		case p.fall == 0:
			sum += real(i * s * ex)
		case t > p.fall:
			sum += real(i * (ex - p.before(s, t)) / complex(p.fall, 0))
		default:
			sum += real(i * ex / complex(p.fall, 0))
		}
	}
	return sum
}

// peak is the highest voltage, walked to as highest has it.
func (p *poleSum) peak() (when, volts float64) {
	end := p.fall + 60/p.slow
	if p.ringing >= 0 {
		end = math.Min(end, p.fall+2*math.Pi/imag(p.s[p.ringing])*1.5)
	}
	return highest(p.bus, end, 2*math.Pi/p.fast/16, p.slope, p.at)
}
