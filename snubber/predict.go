package snubber

import "math"

// circuitValues is what a trial's readings are predicted from, in SI units. The order is that of its derivatives.
type circuitValues [7]float64

const (
	atL  = iota // H
	atC         // F: the node's, with the probe
	atR         // ohm: the loop's
	atCs        // F: the network's; 0: none
	atRs        // ohm: in series with it
	atE         // V
	atI0        // A
)

func (v *circuitValues) respond() Response {
	return respond(Loop{v[atL], v[atC], v[atR]}, Network{C: v[atCs], R: v[atRs]}, Excitation{v[atE], v[atI0]})
}

// signs are the readings a response predicts: the ring's frequency, its decay and the peak. A network that does not
// ring reads no frequency (0 Hz), and decays as its slowest pole does.
func (v *circuitValues) signs() (s [3]float64, peakTime float64) {
	r := v.respond()
	s[ringAt], s[decayAt] = r.ringSigns()
	p := r.Peak()
	s[peakAt] = p.Volts
	return s, p.At
}

func (r *Response) ringSigns() (hz, decay float64) {
	if r.modes.q > 0 {
		hz = math.Sqrt(r.modes.q) * r.w0 / (2 * math.Pi)
	}
	return hz, 1 / (r.modes.slowest() * r.w0)
}

// slopes are the derivatives of the signs by the circuit's values, by central differences. The peak's are those of the
// node's voltage at the time of the peak: there its derivative by time is zero, so that the peak's moving does not
// count (the envelope theorem).
func (v *circuitValues) slopes(peakTime float64) (d [3]circuitValues) {
	const rel = 3e-6 // balances the third derivative's part against rounding
	z := math.Sqrt(v[atL] / v[atC])
	for k := atL; k <= atRs; k++ {
		h := rel * v[k]
		switch k {
		case atR:
			h = rel * math.Max(v[k], 0.01*z)
		case atCs, atRs:
			if v[k] == 0 {
				continue
			}
		}
		low, high := *v, *v
		low[k] -= h
		high[k] += h
		a, b := low.respond(), high.respond()
		hzA, tauA := a.ringSigns()
		hzB, tauB := b.ringSigns()
		d[ringAt][k] = (hzB - hzA) / (2 * h)
		d[decayAt][k] = (tauB - tauA) / (2 * h)
		if !math.IsInf(peakTime, 1) {
			d[peakAt][k] = (b.NodeAt(peakTime) - a.NodeAt(peakTime)) / (2 * h)
		}
	}
	// The node's voltage is linear in the bus and in the current.
	if math.IsInf(peakTime, 1) {
		d[peakAt][atE] = 1
		return d
	}
	one := *v
	one[atE], one[atI0] = 0, 1
	a := one.respond()
	d[peakAt][atI0] = a.NodeAt(peakTime)
	one[atE], one[atI0] = 1, 0
	a = one.respond()
	d[peakAt][atE] = a.NodeAt(peakTime)
	return d
}
