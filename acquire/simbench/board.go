package simbench

import (
	"fmt"
	"math"
)

// Board is what is soldered down: the loop that rings. The rest of the program has to find it out.
type Board struct {
	Inductance float64 // H, > 0: the commutation loop
	Resistance float64 // ohm, >= 0: the loop's loss, in series
	FixedC     float64 // F, >= 0: the part of the node capacitance that no voltage changes
	JunctionC  float64 // F, >= 0: the part that falls with voltage, at 0 V; FixedC + JunctionC > 0
	JunctionV  float64 // V, > 0 where JunctionC > 0: built-in potential
	Grading    float64 // grading exponent, in (0, 1) where JunctionC > 0
	FallTime   float64 // s, >= 0: the switch current falls linearly to zero in this time; 0: at once
	BodyDrop   float64 // V, >= 0: forward drop of the switch's body diode
	BodyOhm    float64 // ohm, >= 0.01: its on-resistance; 0: there is no body diode
	PerLoadA   float64 // > 0: loop current when the switch lets go, as a ratio of the load current
	Duty       float64 // in [0, 1]: supply current over load current, the ringing's own draw aside
}

// CapacitanceAt is the node capacitance at v volts, F, the small-signal one:
//
//	C(v) = FixedC + JunctionC / (1 + v/JunctionV)^Grading
//
// the depletion capacitance of Sze and Ng, Physics of Semiconductor Devices, 3rd ed. 2007, chapter 2
// [from memory]. Below 0 V it goes on as its tangent at 0 V, so that it stays finite.
func (b Board) CapacitanceAt(v float64) float64 {
	switch {
	case b.JunctionC == 0:
		return b.FixedC
	case v < 0:
		return b.FixedC + b.JunctionC*(1-b.Grading*v/b.JunctionV)
	case b.Grading == 0.5: // the usual case, and several times faster
		return b.FixedC + b.JunctionC/math.Sqrt(1+v/b.JunctionV)
	}
	return b.FixedC + b.JunctionC*math.Pow(1+v/b.JunctionV, -b.Grading)
}

// ChargeAt is the charge on the node capacitance at v >= 0 volts, C: the integral of CapacitanceAt.
func (b Board) ChargeAt(v float64) float64 {
	if b.JunctionC == 0 {
		return b.FixedC * v
	}
	n := 1 - b.Grading
	return b.FixedC*v + b.JunctionC*b.JunctionV/n*(math.Pow(1+v/b.JunctionV, n)-1)
}

// chargeArea is the integral of ChargeAt from 0 to v >= 0 volts, J.
func (b Board) chargeArea(v float64) float64 {
	area := b.FixedC * v * v / 2
	if b.JunctionC > 0 {
		n := 1 - b.Grading
		area += b.JunctionC * b.JunctionV / n * (b.JunctionV/(n+1)*(math.Pow(1+v/b.JunctionV, n+1)-1) - v)
	}
	return area
}

// Check reports the first value that no board can have.
func (b Board) Check() error {
	switch {
	case !positive(b.Inductance):
		return fmt.Errorf("board inductance %g H: it must be positive and finite", b.Inductance)
	case !notNegative(b.Resistance):
		return fmt.Errorf("board resistance %g ohm: it must be zero or positive, and finite", b.Resistance)
	case !notNegative(b.FixedC), !notNegative(b.JunctionC), b.FixedC+b.JunctionC == 0:
		return fmt.Errorf("board capacitance %g F fixed and %g F of the junction: neither may be negative nor both zero", b.FixedC, b.JunctionC)
	case b.JunctionC > 0 && !(positive(b.JunctionV) && b.Grading > 0 && b.Grading < 1):
		return fmt.Errorf("board junction of %g V and grading %g: the potential must be positive and the grading in 0 to 1", b.JunctionV, b.Grading)
	case !notNegative(b.FallTime):
		return fmt.Errorf("board fall time %g s: it must be zero or positive, and finite", b.FallTime)
	case !notNegative(b.BodyDrop), b.BodyOhm != 0 && !(b.BodyOhm >= leastDiodeOhm), math.IsInf(b.BodyOhm, 0):
		return fmt.Errorf("body diode of %g V and %g ohm: the drop may not be negative; the resistance is 0, for none, or at least %g ohm", b.BodyDrop, b.BodyOhm, leastDiodeOhm)
	case !positive(b.PerLoadA):
		return fmt.Errorf("loop current %g times the load current: it must be positive and finite", b.PerLoadA)
	case !(b.Duty >= 0 && b.Duty <= 1):
		return fmt.Errorf("duty ratio %g: it must lie in 0 to 1", b.Duty)
	}
	return nil
}

func positive(v float64) bool    { return v > 0 && !math.IsInf(v, 0) }
func notNegative(v float64) bool { return v >= 0 && !math.IsInf(v, 0) }
