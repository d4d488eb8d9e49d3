package snubber

import (
	"fmt"
	"math"
)

// Loop is the parasitic circuit that rings: the inductance of the commutation loop, the capacitance of
// the switching node, and the loss of both as one resistance in series with the inductance.
type Loop struct {
	Inductance  float64 // H, > 0
	Capacitance float64 // F, > 0; the board's own, without a probe
	Resistance  float64 // ohm, >= 0
}

// Impedance is the loop's characteristic impedance Z0 = sqrt(L/C), ohm.
func (l Loop) Impedance() float64 { return math.Sqrt(l.Inductance / l.Capacitance) }

// NaturalHz is the undamped natural frequency f0 = 1/(2 pi sqrt(L C)), Hz.
func (l Loop) NaturalHz() float64 {
	return 1 / (2 * math.Pi * math.Sqrt(l.Inductance*l.Capacitance))
}

// WithProbe is the loop as seen while a probe of the given capacitance (F) hangs on the node.
func (l Loop) WithProbe(c float64) Loop {
	l.Capacitance += c
	return l
}

// Check reports the first value that no loop can have.
func (l Loop) Check() error {
	switch {
	case !(l.Inductance > 0) || math.IsInf(l.Inductance, 0):
		return fmt.Errorf("loop inductance %g H: it must be a positive, finite number", l.Inductance)
	case !(l.Capacitance > 0) || math.IsInf(l.Capacitance, 0):
		return fmt.Errorf("loop capacitance %g F: it must be a positive, finite number", l.Capacitance)
	case !(l.Resistance >= 0) || math.IsInf(l.Resistance, 0):
		return fmt.Errorf("loop resistance %g ohm: it must be zero or a positive, finite number", l.Resistance)
	}
	return nil
}

// Excitation is what sets the loop ringing: a switch that lets go of the load's current, or a diode that lets go of its
// reverse-recovery current after a step of the bus (see TurnOff).
type Excitation struct {
	Bus     float64 // E, V: the voltage the node settles at
	Current float64 // I0, A: the loop current at the instant the switch lets go
}
