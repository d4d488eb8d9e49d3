package simbench

import "math"

// state is the circuit's: loop current i (A), node voltage v (V), voltage u of the network's capacitor (V).
type state [3]float64

// mode says which diodes conduct. Within one mode the equations are smooth.
type mode struct {
	body    bool // the switch's body diode
	network bool // the diode across the network's resistor
}

// circuit is the board with the parts that are really on it, at one operating point.
type circuit struct {
	board    Board
	bus      float64 // E, V
	current  float64 // I0, A: loop current when the switch lets go, t = 0
	fixed    float64 // F: what lies straight across the node: probe, relays' capacitors, and one with next to no resistance
	branchC  float64 // F: the capacitor of the network's branch; 0: no branch
	branchR  float64 // ohm: the branch's resistor, its ESR aside
	branchZ  float64 // ohm: the ESR
	hasDiode bool    // a diode lies across branchR
	drop, on float64 // V, ohm: that diode
}

// shortest is the time constant, s, below which a network's resistance is left out and its capacitor lies
// straight across the node: a thousandth of the ring's at 300 MHz, but a burden to the integration.
const shortest = 0.5e-12

// newCircuit lays the network n, of actual values, onto the board; besides the network, across farads lie across the
// node.
func newCircuit(b Board, p Parts, n Network, bus, current, across float64) circuit {
	c := circuit{board: b, bus: bus, current: current, fixed: across, drop: p.DiodeDrop, on: p.DiodeOhm}
	if n.Kind == Bare {
		return c
	}
	node := b.CapacitanceAt(bus) + across
	if (n.R+p.ESR)*n.C*node/(n.C+node) < shortest {
		c.fixed += n.C
		return c
	}
	c.branchC, c.branchR, c.branchZ = n.C, n.R, p.ESR
	c.hasDiode = n.Kind == RCD
	return c
}

// switchCurrent is the current the switch still carries at t, A.
func (c *circuit) switchCurrent(t float64) float64 {
	if t >= c.board.FallTime {
		return 0
	}
	return c.current * (1 - t/c.board.FallTime)
}

// branchCurrent is the current into the network, A:
//
//	diode off: (v - u) / (R + ESR)
//	diode on:  its drop and on-resistance lie across R, in series with ESR
func (c *circuit) branchCurrent(y state, m mode) float64 {
	if c.branchC == 0 {
		return 0
	}
	across := y[1] - y[2]
	if !m.network {
		return across / (c.branchR + c.branchZ)
	}
	g := 1/c.branchR + 1/c.on
	return (g*across - c.drop/c.on) / (1 + g*c.branchZ)
}

// bodyCurrent is the current of the body diode into the node, A.
func (c *circuit) bodyCurrent(y state, m mode) float64 {
	if !m.body {
		return 0
	}
	return (-c.board.BodyDrop - y[1]) / c.board.BodyOhm
}

// slope is the state's time derivative:
//
//	L i'    = E - v - r i
//	C(v) v' = i - i_sw(t) + i_body - i_branch
//	Cs u'   = i_branch
func (c *circuit) slope(t float64, y state, m mode) state {
	branch := c.branchCurrent(y, m)
	d := state{
		(c.bus - y[1] - c.board.Resistance*y[0]) / c.board.Inductance,
		(y[0] - c.switchCurrent(t) + c.bodyCurrent(y, m) - branch) / (c.board.CapacitanceAt(y[1]) + c.fixed),
	}
	if c.branchC > 0 {
		d[2] = branch / c.branchC
	}
	return d
}

// margins tells how far each diode is above its threshold, V; positive: it conducts. Currents are
// continuous there, so a diode's own threshold is the same whether it conducts or not.
func (c *circuit) margins(y state) (body, network float64) {
	body, network = math.Inf(-1), math.Inf(-1)
	if c.board.BodyOhm > 0 {
		body = -c.board.BodyDrop - y[1]
	}
	if c.hasDiode {
		network = (y[1]-y[2])*c.branchR/(c.branchR+c.branchZ) - c.drop
	}
	return body, network
}

// start is the state when the switch lets go: it has held the node and the network at 0 V.
func (c *circuit) start() state { return state{c.current} }

// scale is the size of each state that errors are measured against, so that small values near a zero
// crossing do not stop the integration.
func (c *circuit) scale() state {
	v := max(c.bus, 1)
	z := math.Sqrt(c.board.Inductance / (c.board.CapacitanceAt(c.bus) + c.fixed))
	return state{max(v/z, c.current), v, v}
}
