package snubber

import "math"

// tail is the rest of an edge in which a diode without a drop goes on switching for ever.
//
// With no drop the circuit's equations are the same for a state and for any positive multiple of it. The diode then conducts
// once in every turn of the ring however small that is, and the turns soon come to repeat, each the one before times k < 1 in
// the same time: what is left is a geometric series, k/(1 - k) of the last turn's charge and k^2/(1 - k^2) of its energies.
type tail struct {
	from, period float64 // of the last turn walked; period 0: there is no tail
	k            float64
}

// cycle is an edge at an instant at which the diode begins to conduct.
type cycle struct {
	at float64
	x  state
	sums
}

// How nearly a turn must be a multiple k of the one before, for all that follow to be taken as such: by repeating of what a
// turn loses, 1 - k, which all the turns to come rest on, but no closer than rounding lets it be.
const (
	repeating   = 1e-7
	leastRepeat = 1e-12
)

// turnsOn is how often the diode may begin to conduct within one turn.
const turnsOn = 40

// repeat adds the tail where a turn that ends at b repeats.
func (w *walk) repeat(last []cycle, b cycle) bool {
	for _, a := range last {
		if w.repeats(a, b) {
			return true
		}
	}
	return false
}

// repeats adds the tail where the turn from a to b is one that repeats.
func (w *walk) repeats(a, b cycle) bool {
	before, after := w.c.stored(a.x), w.c.stored(b.x)
	if before == 0 || after >= before {
		return false
	}
	k := math.Sqrt(after / before)
	var off state
	for i := range off {
		off[i] = b.x[i] - k*a.x[i]
	}
	near := math.Max(repeating*(1-k), leastRepeat)
	if w.c.stored(off) > near*near*after {
		return false
	}
	w.tail = tail{a.at, b.at - a.at, k}
	w.ends = math.Inf(1)
	part := after / (before - after) // k^2/(1-k^2)
	w.charge += (b.charge - a.charge) * (part + math.Sqrt(part*(1+part)))
	w.square += (b.square - a.square) * part
	w.energy.Resistor += (b.energy.Resistor - a.energy.Resistor) * part
	w.energy.ESR += (b.energy.ESR - a.energy.ESR) * part
	w.energy.Loop += (b.energy.Loop - a.energy.Loop) * part
	w.energy.Diode += (b.energy.Diode - a.energy.Diode) * part
	return true
}

// back is the instant of the last turn walked that tau repeats, and how much smaller all is at tau.
func (t tail) back(tau float64) (float64, float64) {
	if t.period == 0 || tau < t.from+t.period {
		return tau, 1
	}
	n := math.Floor((tau - t.from) / t.period)
	return tau - n*t.period, math.Pow(t.k, n)
}
