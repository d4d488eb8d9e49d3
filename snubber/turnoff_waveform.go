package snubber

import "math"

// Waveform is the edge as a function of time, t in seconds after the switch lets go. It is exact at any t; before the edge
// all is zero but the loop current.
type Waveform struct {
	c        *normal
	segments []segment
	end      float64 // in units of 1/w0: from here on all has settled
	tail     tail
}

// NodeAt is the node's voltage, V.
func (w Waveform) NodeAt(t float64) float64 {
	return w.volts(t, nodeVoltage)
}

// CapacitorAt is the voltage of the network's capacitor, without its ESR, V; on a bare node it is the node's.
func (w Waveform) CapacitorAt(t float64) float64 {
	if w.c != nil && w.c.a == 0 {
		return w.volts(t, nodeVoltage)
	}
	return w.volts(t, innerVoltage)
}

// LoopCurrentAt is the current in the loop's inductance, A.
func (w Waveform) LoopCurrentAt(t float64) float64 {
	return w.amps(math.Max(t, 0), func(*mode) affine { return loopCurrent })
}

// NetworkCurrentAt is the current into the network, which is its capacitor's, A.
func (w Waveform) NetworkCurrentAt(t float64) float64 {
	return w.amps(t, func(m *mode) affine { return m.branch })
}

// ResistorCurrentAt is the current of the network's resistor, A.
func (w Waveform) ResistorCurrentAt(t float64) float64 {
	return w.amps(t, func(m *mode) affine { return m.resistor })
}

// DiodeCurrentAt is the current of the network's diode, A.
func (w Waveform) DiodeCurrentAt(t float64) float64 {
	return w.amps(t, func(m *mode) affine { return m.diode })
}

// volts is a voltage that settles at the bus.
func (w Waveform) volts(t float64, q affine) float64 {
	if !(t >= 0) || w.c == nil {
		return 0
	}
	return w.c.bus + w.at(t, func(*mode) affine { return q })
}

// amps is a current.
func (w Waveform) amps(t float64, of func(*mode) affine) float64 {
	if !(t >= 0) || w.c == nil {
		return 0
	}
	return w.at(t, of) / w.c.z0
}

func (w Waveform) at(t float64, of func(*mode) affine) float64 {
	tau, scale := w.tail.back(t * w.c.w0)
	if len(w.segments) == 0 || tau > w.end {
		return 0
	}
	lo, hi := 0, len(w.segments) // the last that starts at or before tau
	for hi-lo > 1 {
		if mid := (lo + hi) / 2; w.segments[mid].from <= tau {
			lo = mid
		} else {
			hi = mid
		}
	}
	s := &w.segments[lo]
	y := s.of(of(s.m))
	return scale * y.at(tau-s.from)
}
