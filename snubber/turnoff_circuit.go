package snubber

import (
	"math"
	"math/cmplx"
)

// state is the circuit's in volts, measured from where it settles: z = i Z0 of the loop, d = v - E of the node, g = u - E of
// the network's capacitor, y = Z0 times the current of a resistor that has inductance.
type state [4]float64

// affine is a quantity as k times the state and a constant.
type affine struct {
	k state
	c float64
}

func (a affine) of(x state) float64 {
	v := a.c
	for i, k := range a.k {
		v += k * x[i]
	}
	return v
}

// plus is a + f b.
func (a affine) plus(f float64, b affine) affine {
	for i := range a.k {
		a.k[i] += f * b.k[i]
	}
	a.c += f * b.c
	return a
}

func (a affine) times(f float64) affine { return affine{}.plus(f, a) }

// mode is the circuit with its diode off, or on: linear, and the same for any state.
type mode struct {
	a        [4]state // x' = a (x - rest), in units of w0
	rest     state
	p        poles
	branch   affine // Z0 times the current into the network
	resistor affine // the same of its resistor
	diode    affine // of its diode
	watch    affine // off: what lies above the diode's drop; on: its current. Negative ends on, positive off
}

// normal is a circuit in units of its loop's Z0 and w0: modes of modes.go and methods are in the same.
type normal struct {
	w0, z0                float64
	loss, rho, esr, diode float64 // r, R, ESR and the diode's resistance over Z0
	lambda                float64 // the resistor's inductance over the loop's
	a                     float64 // Cs/C
	drop, bus, left       float64 // V
	kind                  Kind
	start                 state
}

func newNormal(l Loop, n Network, e Excitation, left float64) *normal {
	z0 := l.Impedance()
	c := &normal{
		w0: 1 / math.Sqrt(l.Inductance*l.Capacitance), z0: z0,
		loss: l.Resistance / z0, rho: n.R / z0, esr: n.ESR / z0, diode: n.DiodeOhm / z0,
		lambda: n.RInductance / l.Inductance, a: n.C / l.Capacitance,
		drop: n.DiodeDrop, bus: e.Bus, left: left, kind: n.Kind,
	}
	c.start = state{e.Current * z0, -e.Bus, left - e.Bus, 0}
	if c.a == 0 {
		c.start[2] = 0
	}
	return c
}

// stored is the energy that the circuit will still lose in state x, in units of C V^2.
func (c *normal) stored(x state) float64 {
	return (x[0]*x[0] + x[1]*x[1] + c.a*x[2]*x[2] + c.lambda*x[3]*x[3]) / 2
}

// mode sets up the circuit with its diode on or off. With w = v - u across the network's resistances, V the drop, and iR, iD
// the currents of resistor and diode:
//
//	off   w = (esr + R) iR + LR iR'                              watch: w - esr iR - V, the diode's voltage above its drop
//	on    w = esr (iR + iD) + V + Rd iD = esr (iR + iD) + R iR + LR iR'                           watch: iD
//
// Both watches vanish together, and all states are continuous there. Where a diode without resistance meets a capacitor
// without, w is held at V and the two capacitors share the loop's current.
//
// With the network's admittance as a s num/den, the characteristic polynomial is den + (s + r)(s den + a s num).
func (c *normal) mode(on bool) (m mode, ok bool) {
	w, y := affine{k: state{0, 1, -1, 0}}, affine{k: state{0, 0, 0, 1}}
	shared := affine{k: state{c.a / (1 + c.a)}} // the network's part of the loop current where w is held
	var across affine                           // voltage of the resistor with its inductance
	num, den := [2]float64{1, 0}, [3]float64{1, c.a * (c.esr + c.rho), c.a * c.lambda}
	held := false
	switch {
	case c.a == 0:
	case on:
		switch held = c.esr+c.diode == 0; {
		case held:
			m.branch = shared
			across.c = c.drop
			if c.lambda > 0 {
				m.resistor = y
			} else {
				m.resistor.c = c.drop / c.rho
			}
			m.diode = m.branch.plus(-1, m.resistor)
		case c.lambda > 0:
			m.resistor = y
			m.diode = w.plus(-c.esr, y)
			m.diode.c -= c.drop
			m.diode = m.diode.times(1 / (c.esr + c.diode))
			across = m.diode.times(c.diode)
			across.c += c.drop
		default:
			m.diode = w
			m.diode.c -= c.drop * (1 + c.esr/c.rho)
			m.diode = m.diode.times(1 / (c.esr + c.diode + c.esr*c.diode/c.rho))
			m.resistor = m.diode.times(c.diode / c.rho)
			m.resistor.c += c.drop / c.rho
		}
		if !held {
			m.branch = m.resistor.plus(1, m.diode)
		}
		m.watch = m.diode
		num = [2]float64{c.diode + c.rho, c.lambda}
		den = [3]float64{c.diode + c.rho, c.lambda + c.a*(c.esr*c.diode+c.esr*c.rho+c.diode*c.rho),
			c.a * c.lambda * (c.esr + c.diode)}
		through := c.drop / (c.rho + c.diode) // from the drop round through the resistor, which a diode at rest would not let
		m.rest[2] = -c.rho * through
		if c.lambda > 0 {
			m.rest[3] = through
		}
	case c.esr+c.rho+c.lambda == 0:
		held, m.branch = true, shared
	default:
		if c.lambda > 0 {
			m.branch = y
			across = w.plus(-c.esr, y)
		} else {
			m.branch = w.times(1 / (c.esr + c.rho))
		}
		if c.kind.HasR() {
			m.resistor = m.branch
		}
		m.watch = w.plus(-c.esr, m.branch)
		if c.lambda == 0 && c.kind.HasR() { // the same, and as exact where R is small
			m.watch = m.branch.times(c.rho)
		}
		m.watch.c -= c.drop
	}
	m.a[0] = state{-c.loss, -1, 0, 0}
	m.a[1] = affine{k: state{1}}.plus(-1, m.branch).k
	if held {
		m.a[1] = state{1 / (1 + c.a)}
		m.a[2] = m.a[1]
	} else if c.a > 0 {
		m.a[2] = m.branch.times(1 / c.a).k
	}
	if c.lambda > 0 {
		m.a[3] = across.plus(-c.rho, m.resistor).times(1 / c.lambda).k
	}
	d := [5]float64{den[0], den[1], den[2]}
	for i, x := range den {
		d[i+1] += c.loss * x
		d[i+2] += x
	}
	for i, x := range num {
		d[i+1] += c.loss * c.a * x
		d[i+2] += c.a * x
	}
	m.p, ok = polesOf(d[:])
	return m, ok
}

// solution is the state of a mode as a sum over its poles.
type solution struct {
	m *mode
	x [4][4]complex128 // pole, state
}

// from solves m from state x: the part of pole k is the product of (A - sj)/(sk - sj) over the other poles, its projector
// (Moler and Van Loan, SIAM Review 20, 801, 1978, method 14, from memory). growth is how much larger the parts are than what
// they add up to: where poles meet they cancel, and digits go.
func (c *normal) from(m *mode, x state) (s solution, growth float64) {
	s.m = m
	all, weight := 0.0, [4]float64{1, 1, c.a, c.lambda}
	for k := range m.p.n {
		var v [4]complex128
		for i := range v {
			v[i] = complex(x[i]-m.rest[i], 0)
		}
		for _, other := range others(&m.p, k) {
			var next [4]complex128
			for i := range next {
				for j, a := range m.a[i] {
					next[i] += complex(a, 0) * v[j]
				}
				next[i] = (next[i] - other*v[i]) / (m.p.s[k] - other)
			}
			v = next
		}
		size := 0.0
		for i := range v {
			if imag(m.p.s[k]) != 0 {
				v[i] *= 2
			} else {
				v[i] = complex(real(v[i]), 0)
			}
			size += weight[i] * (real(v[i])*real(v[i]) + imag(v[i])*imag(v[i]))
		}
		s.x[k] = v
		all += math.Sqrt(size)
	}
	scale := 0.0
	for i, w := range weight {
		scale += w * (x[i] - m.rest[i]) * (x[i] - m.rest[i])
	}
	if scale > 0 {
		growth = all / math.Sqrt(scale)
	}
	if math.IsNaN(all) || math.IsInf(all, 0) {
		growth = math.Inf(1)
	}
	return s, growth
}

// others are the poles, conjugates too, but for number k; the smallest first, because what rounding leaves along a fast pole is
// taken off by that pole's own factor, and would grow under any that came after it.
func others(p *poles, k int) []complex128 {
	list := make([]complex128, 0, 4)
	add := func(s complex128) {
		list = append(list, s)
		for i := len(list) - 1; i > 0 && cmplx.Abs(list[i]) < cmplx.Abs(list[i-1]); i-- {
			list[i], list[i-1] = list[i-1], list[i]
		}
	}
	for j, s := range p.s[:p.n] {
		if j != k {
			add(s)
		}
		if imag(s) != 0 {
			add(cmplx.Conj(s))
		}
	}
	return list
}

// of is a quantity of the circuit as a function of time. Of the network's own w = v - u it is exact also where w is small
// against both, because the parts are subtracted before they are summed.
func (s *solution) of(a affine) expSum {
	y := expSum{p: &s.m.p, c: a.of(s.m.rest)}
	for k := range s.m.p.n {
		for i, f := range a.k {
			if f != 0 {
				y.a[k] += complex(f, 0) * s.x[k][i]
			}
		}
	}
	return y
}

func (s *solution) state(t float64) (x state) {
	for i := range x {
		unit := affine{}
		unit.k[i] = 1
		y := s.of(unit)
		x[i] = y.at(t)
	}
	return x
}
