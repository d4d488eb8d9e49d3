package snubber

import "math"

// ringing is the linear circuit after a turn-off, from any state, in the normalised form of Response: its state is
// z = i Z0 and the voltages d, g of node and network capacitor from where they settle.
type ringing struct {
	modes        modes
	w0, z0, bus  float64
	c            float64 // F: the loop's, the unit of energy with V^2
	loss, rho, a float64
}

func newRinging(r Response, l Loop, n Network) ringing {
	return ringing{modes: r.modes, w0: r.w0, z0: r.z0, bus: r.bus, c: l.Capacitance,
		loss: l.Resistance / r.z0, rho: n.SeriesOhm() / r.z0, a: n.C / l.Capacitance}
}

func (q ringing) start(e Excitation, volts [2]float64) [3]float64 {
	return [3]float64{e.Current * q.z0, volts[0] - q.bus, volts[1] - q.bus}
}

func (q ringing) volts(x [3]float64) [2]float64 { return [2]float64{x[1] + q.bus, x[2] + q.bus} }

// slope is x'.
func (q ringing) slope(x [3]float64) [3]float64 {
	if q.rho == 0 {
		v := x[0] / (1 + q.a)
		return [3]float64{-x[1] - q.loss*x[0], v, v}
	}
	y := (x[1] - x[2]) / q.rho
	return [3]float64{-x[1] - q.loss*x[0], x[0] - y, y / q.a}
}

// after is the state t seconds later; 0 seconds stands for so late that all has settled.
func (q ringing) after(x [3]float64, t float64) [3]float64 {
	if t == 0 {
		return [3]float64{}
	}
	x1 := q.slope(x)
	x2 := q.slope(x1)
	b := q.modes.basis(q.w0 * t)
	var out [3]float64
	for i := range out {
		out[i] = q.modes.from(x[i], x1[i], x2[i]).at(b)
	}
	return out
}

// energies are what the network's resistance and the loop's take, J, on the way from x0 to x1.
func (q ringing) energies(x0, x1 [3]float64) (rs, loop float64) {
	if q.rho == 0 {
		// All in the loop, also in the limit of none of its own.
		return 0, q.c * (q.stored(x0) - q.stored(x1))
	}
	rs0, loop0 := q.toRest(x0)
	if x1 == ([3]float64{}) {
		return q.c * rs0, q.c * loop0
	}
	rs1, loop1 := q.toRest(x1)
	return q.c * (rs0 - rs1), q.c * (loop0 - loop1)
}

// stored is the energy above that at rest, in units of C V^2.
func (q ringing) stored(x [3]float64) float64 { return (x[0]*x[0] + x[1]*x[1] + q.a*x[2]*x[2]) / 2 }

// toRest is energies from x to rest in units of C V^2, with k = (1 + a)/(rho a), y = d - g across the resistance and
// p = (d + a g)/(1 + a) where the two capacitors would meet. The transforms, derived from Response's equations, are
//
//	Y = (y s^2 + (z + loss y) s + y/(1+a) - p)/D      Z = (z s^2 + (k z - d) s - k p)/D
//	D = s^3 + (k + loss) s^2 + (1 + loss k) s + 1/(rho a)
func (q ringing) toRest(x [3]float64) (rs, loop float64) {
	z, d, g := x[0], x[1], x[2]
	k := (1 + q.a) / (q.rho * q.a)
	y, p := d-g, (d+q.a*g)/(1+q.a)
	a2, a1, a0 := k+q.loss, 1+q.loss*k, 1/(q.rho*q.a)
	h := 1/q.rho + q.loss*(1+k*k+q.loss*k) // a1 a2 - a0, without its cancellation
	rs = square3(y, z+q.loss*y, y/(1+q.a)-p, a2, a1, a0, h) / q.rho
	loop = square3(z, k*z-d, -k*p, a2, a1, a0, h) * q.loss
	return rs, loop
}

// square3 is the integral over all time of the square of the signal whose transform is
//
//	(b2 s^2 + b1 s + b0)/(s^3 + a2 s^2 + a1 s + a0)      h = a1 a2 - a0
//
// from Parseval's theorem (H. James, N. Nichols and R. Phillips, Theory of Servomechanisms, 1947, appendix;
// attribution from memory, the formula checked against Lyapunov's equation and against integration).
func square3(b2, b1, b0, a2, a1, a0, h float64) float64 {
	return (b2*b2*a1 + b1*b1 - 2*b0*b2 + b0*b0*a2/a0) / (2 * h)
}

// discharge is the circuit while the switch conducts: C across the switch's resistance, and the network across both.
type discharge struct{ c, cs, rs, sw float64 } // F, F, ohm, ohm

func newDischarge(l Loop, n Network, c Cycle) discharge {
	return discharge{c: l.Capacitance, cs: n.C, rs: n.SeriesOhm(), sw: c.SwitchOhm}
}

// energies are what the network's resistance and the switch take from voltages v of node and network capacitor until
// both are empty, J. With g and y the conductances of switch and network, the integrals of the equations of v^2, v u
// and u^2 give that of v u, and so that of g v^2. Derived here.
func (q discharge) energies(volts [2]float64) (rs, sw float64) {
	v, u := volts[0], volts[1]
	node, net := q.c*v*v/2, q.cs*u*u/2
	switch {
	case q.rs == 0:
		return 0, node + net
	case q.sw == 0:
		return net, node
	}
	g, y := 1/q.sw, 1/q.rs
	vu := (u*v + net/q.c + y/q.cs*node/(g+y)) / (y/q.cs*g/(g+y) + g/q.c)
	sw = g * (y*vu + node) / (g + y)
	return node + net - sw, sw
}

// after is the voltages t > 0 seconds later: two real poles, that of the node the faster.
func (q discharge) after(volts [2]float64, t float64) [2]float64 {
	v, u := volts[0], volts[1]
	switch {
	case q.rs == 0:
		v *= decay(t, q.sw*(q.c+q.cs))
		return [2]float64{v, v}
	case q.sw == 0:
		return [2]float64{0, u * decay(t, q.rs*q.cs)}
	}
	g, y := 1/q.sw, 1/q.rs
	b, c := (g+y)/q.c+y/q.cs, g/q.c*y/q.cs
	half := b / 2
	fast := -(half + math.Sqrt(half*half-c))
	slow := c / fast
	es, ef := math.Exp(slow*t), math.Exp(fast*t)
	mix := func(x, slope float64) float64 {
		s := (slope - fast*x) / (slow - fast)
		return s*es + (x-s)*ef
	}
	return [2]float64{mix(v, (y*u-(g+y)*v)/q.c), mix(u, y*(v-u)/q.cs)}
}

// decay is exp(-t/tau), 0 where tau is.
func decay(t, tau float64) float64 {
	if tau == 0 {
		return 0
	}
	return math.Exp(-t / tau)
}
