package snubber

import (
	"fmt"
	"math"
)

// Cycle is how the switch is used. The zero value of each field but Hz is its common case.
type Cycle struct {
	Hz        float64 // Hz, >= 0: one turn-off and one turn-on in each period
	OnS       float64 // s, >= 0: how long the switch conducts; 0: long enough for the network to discharge
	OffS      float64 // s, >= 0: how long it blocks; 0: long enough for all to settle
	FallS     float64 // s, >= 0: how long its current takes to fall, linearly; 0: not considered
	SwitchOhm float64 // ohm, >= 0: its resistance when on; 0: small beside the network's
}

func (c Cycle) check() error {
	switch {
	case !(c.Hz >= 0) || math.IsInf(c.Hz, 0):
		return fmt.Errorf("switching frequency %g Hz: it must be zero or a positive, finite number", c.Hz)
	case !(c.OnS >= 0) || math.IsInf(c.OnS, 0):
		return fmt.Errorf("on time %g s: it must be positive and finite, or zero where it is long", c.OnS)
	case !(c.OffS >= 0) || math.IsInf(c.OffS, 0):
		return fmt.Errorf("off time %g s: it must be positive and finite, or zero where it is long", c.OffS)
	case c.Hz*(c.OnS+c.OffS) > 1+1e-9:
		return fmt.Errorf("on time %g s and off time %g s: together they exceed the period of %g s at %g Hz", c.OnS, c.OffS, 1/c.Hz, c.Hz)
	case !(c.FallS >= 0) || math.IsInf(c.FallS, 0):
		return fmt.Errorf("fall time %g s: it must be zero or a positive, finite number", c.FallS)
	case !(c.SwitchOhm >= 0) || math.IsInf(c.SwitchOhm, 0):
		return fmt.Errorf("the switch's resistance %g ohm: it must be zero or a positive, finite number", c.SwitchOhm)
	}
	return nil
}

// EdgeEnergy is where the energy of one edge goes, J.
type EdgeEnergy struct{ Resistor, ESR, Diode, Switch, Loop float64 }

// Total is the sum, J.
func (w EdgeEnergy) Total() float64 { return w.Resistor + w.ESR + w.Diode + w.Switch + w.Loop }

// CycleEnergy is where the energy of one cycle goes once the cycles repeat, J.
//
//	Off.Total() + On.Total() = Added + Anyway
//	Added  = E Cs (u1 - u0)                          what the source gives to the network's capacitor
//	Anyway = E C (v1 - v0) + L (I0^2 - i1^2)/2       what it gives to the node, and the loop's current
//
// with v, u and i at the turn-off (0) and at the next turn-on (1). Where all settles these are Cs E^2, and C E^2/2
// at each edge with L I0^2/2. The current i1 left at the turn-on stays in the loop: the switch takes it over.
type CycleEnergy struct {
	Off, On       EdgeEnergy
	Added, Anyway float64
	Saved         float64 // of the switch's own overlap at turn-off (TurnOffSaving); 0 without Cycle.FallS, and for rc

	low, high [2]float64 // V: node and network capacitor when the turn-off and the turn-on begin
}

// EnergyOf is where the energy of one cycle goes: a turn-off at excitation e and the following turn-on.
//
// At turn-off the energy is shared by the network's resistance and the loop's as their currents share it; at
// turn-on the node's capacitance discharges through the switch, and the network's through its resistance and the
// switch's in series. With Cycle's times the states at either edge are those of the cycle that repeats itself.
// All is exact for the circuit of the package comment: energies are integrals of squares of transforms (see
// square3), the states closed forms. A network with a diode, or with inductance in its resistor, goes through TurnOff,
// which follows it until all has settled: an off time too short for that is an error that says so.
func EnergyOf(l Loop, n Network, e Excitation, c Cycle) (CycleEnergy, error) {
	if err := c.check(); err != nil {
		return CycleEnergy{}, err
	}
	if n.Kind == RCD || n.RInductance > 0 {
		return settledEnergy(l, n, e, c)
	}
	r, err := Respond(l, n, e)
	if err != nil {
		return CycleEnergy{}, err
	}
	off, on := newRinging(r, l, n), newDischarge(l, n, c)
	var w CycleEnergy
	if c.OnS > 0 {
		w.low = repeats(e.Bus+e.Current*off.z0, func(low [2]float64) [2]float64 {
			return on.after(off.volts(off.after(off.start(e, low), c.OffS)), c.OnS)
		})
	}
	x0 := off.start(e, w.low)
	x1 := off.after(x0, c.OffS)
	w.high = off.volts(x1)

	rs, loop := off.energies(x0, x1)
	w.Off.Loop = loop
	w.Off.Resistor, w.Off.ESR = n.split(rs)
	rs, w.On.Switch = on.energies(w.high)
	if c.OnS > 0 {
		restRs, restSwitch := on.energies(w.low)
		rs, w.On.Switch = rs-restRs, w.On.Switch-restSwitch
	}
	w.On.Resistor, w.On.ESR = n.split(rs)
	w.Saved = saved(l, n, e, c)

	i1 := x1[0] / off.z0
	w.Added = e.Bus * n.C * (w.high[1] - w.low[1])
	w.Anyway = e.Bus*l.Capacitance*(w.high[0]-w.low[0]) + l.Inductance*(e.Current*e.Current-i1*i1)/2
	return w, nil
}

// settlingTimes is how many time constants of a network's capacitor a time must hold for it to count as long: what is left
// in voltage is 0.7 %, in energy 5e-5.
const settlingTimes = 5

// settledEnergy is EnergyOf from TurnOff: all settles while the switch blocks. A network with a diode may still hold a
// charge from the cycle before when the switch has conducted, which the next turn-off starts from.
func settledEnergy(l Loop, n Network, e Excitation, c Cycle) (CycleEnergy, error) {
	on := newDischarge(l, n, c)
	least := settlingTimes * (n.SeriesOhm() + c.SwitchOhm) * n.C
	w := CycleEnergy{high: [2]float64{e.Bus, e.Bus}, Saved: saved(l, n, e, c)}
	switch t := orLong(c.OnS); {
	case orLong(c.OffS) < least:
		return CycleEnergy{}, fmt.Errorf("network %s with an off time of %.3g s: its capacitor takes %.3g s (five times R C) to settle; take a smaller resistor or capacitor, or a longer time", n.Kind, c.OffS, least)
	case t >= least:
	case n.RInductance > 0 || c.SwitchOhm > 0:
		return CycleEnergy{}, fmt.Errorf("network %s with an on time of %.3g s: its capacitor takes %.3g s (five times R C) to discharge, and what is left is only known without inductance in R and resistance in the switch; leave these out, or take a longer time", n.Kind, c.OnS, least)
	default:
		w.low = on.after(w.high, t)
	}
	turn, err := turnOff(l, n, e, w.low[1])
	if err != nil {
		return CycleEnergy{}, err
	}
	w.Off = EdgeEnergy{Resistor: turn.Energy.Resistor, ESR: turn.Energy.ESR, Diode: turn.Energy.Diode, Loop: turn.Energy.Loop}
	rs, sw := on.energies(w.high)
	restRs, restSwitch := on.energies(w.low)
	w.On.Switch = sw - restSwitch
	w.On.Resistor, w.On.ESR = n.split(rs - restRs)
	w.Added = n.C * e.Bus * (e.Bus - w.low[1])
	w.Anyway = l.Capacitance*e.Bus*e.Bus + l.Inductance*e.Current*e.Current/2
	return w, nil
}

// orLong is a time of Cycle as it counts: zero stands for long.
func orLong(t float64) float64 {
	if t == 0 {
		return math.Inf(1)
	}
	return t
}

// saved is what the network's capacitor, beside the node's own, spares the switch at turn-off. A resistor in series
// without a diode is in its way, and nothing is claimed for it.
func saved(l Loop, n Network, e Excitation, c Cycle) float64 {
	if c.FallS == 0 || n.Kind != C && n.Kind != RCD {
		return 0
	}
	return overlap(l.Capacitance, e, c.FallS) - overlap(l.Capacitance+n.C, e, c.FallS)
}

// split shares an energy between the network's resistor and its capacitor's ESR: one current, so as the resistances.
func (n Network) split(w float64) (resistor, esr float64) {
	if n.ESR == 0 {
		return w, 0
	}
	esr = w * n.ESR / n.SeriesOhm()
	return w - esr, esr
}

// repeats finds the voltages that one cycle, an affine map, gives back: (1 - M) x = c, by Cramer's rule. Scale is a
// voltage of the circuit's own size.
func repeats(scale float64, cycle func([2]float64) [2]float64) [2]float64 {
	if scale == 0 {
		return [2]float64{}
	}
	c := cycle([2]float64{})
	p, q := cycle([2]float64{scale, 0}), cycle([2]float64{0, scale})
	m00, m10 := 1-(p[0]-c[0])/scale, -(p[1]-c[1])/scale
	m01, m11 := -(q[0]-c[0])/scale, 1-(q[1]-c[1])/scale
	det := m00*m11 - m01*m10
	return [2]float64{(c[0]*m11 - m01*c[1]) / det, (m00*c[1] - c[0]*m10) / det}
}
