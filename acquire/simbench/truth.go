package simbench

import "math"

// Truth is what the program has to find out, in SI units. It does not count the probe in.
type Truth struct {
	Inductance     float64 // H
	Resistance     float64 // ohm
	CapacitanceBus float64 // F: small-signal, with the node at the bus voltage
	CapacitanceAvg float64 // F: charge over voltage for the whole swing from 0 V to twice the bus voltage
	Excitation     float64 // A: loop current when the switch begins to let go
	Apparent       float64 // A: the excitation of the linear loop that swings as far; see apparent
	RingHz         float64 // Hz: natural frequency with CapacitanceBus, 1/(2 pi sqrt(L C))
}

// Truth is what is hidden on the board at the operating point of the configuration.
func (m *Model) Truth() Truth { return truth(m.cfg.Board, m.cfg.BusV, m.cfg.LoadA) }

func truth(b Board, bus, load float64) Truth {
	t := Truth{
		Inductance: b.Inductance, Resistance: b.Resistance,
		CapacitanceBus: b.CapacitanceAt(bus), CapacitanceAvg: b.CapacitanceAt(bus),
		Excitation: b.PerLoadA * load,
	}
	if bus > 0 {
		t.CapacitanceAvg = b.ChargeAt(2*bus) / (2 * bus)
	}
	t.Apparent = apparent(b, bus, t.Excitation)
	t.RingHz = 1 / (2 * math.Pi * math.Sqrt(t.Inductance*t.CapacitanceBus))
	return t
}

// apparent is the excitation that a linear loop with the capacitance at the bus voltage, let go of at once,
// would need to swing as far. The loop current goes on rising, at E/L, while the switch current falls; and
// the charge of a capacitance that is larger below the bus voltage is paid for with more energy from the bus:
//
//	I'^2 = (I0 + E tf/(2 L))^2 + (2/L) (integral of Q(v) dv from 0 to E - C(E) E^2/2)
//
// Derived here, from the energy in the inductance when the node passes E, loss neglected and tf short against the
// ring; good to some 5 % of the current (model_test.go).
func apparent(b Board, bus, current float64) float64 {
	late := current + bus*b.FallTime/(2*b.Inductance)
	extra := b.chargeArea(bus) - b.CapacitanceAt(bus)*bus*bus/2
	return math.Sqrt(late*late + 2/b.Inductance*extra)
}
