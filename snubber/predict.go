package snubber

import "math"

// circuitValues is what a trial's readings are predicted from, in SI units. The order is that of its derivatives.
type circuitValues [12]float64

const (
	atL     = iota // H
	atC            // F: the node's, with the probe
	atR            // ohm: the loop's
	atCs           // F: the network's; 0: none
	atRs           // ohm: in series with it
	atE            // V
	atI0           // A
	atFall         // s: the switch current's fall time; 0: it lets go at once
	atLead         // H: in series with the network's capacitor
	atShare        // of the node's capacitance, that falls with voltage
	atProbe        // F: the part of atC that is the probe's
	atRef          // V: the bus at which the node's capacitance is stated
)

// plain says that no effect beyond the linear loop is in play, so that the closed form serves.
func (v *circuitValues) plain() bool { return v[atFall] == 0 && v[atLead] == 0 && v[atShare] == 0 }

func (v *circuitValues) respond() Response {
	return respond(Loop{v[atL], v[atC], v[atR]}, Network{C: v[atCs], R: v[atRs]}, Excitation{v[atE], v[atI0]})
}

// signs are the readings a response predicts: the ring's frequency, its decay and, where it is wanted, the peak. A network that does not
// ring reads no frequency (0 Hz), and decays as its slowest pole does.
func (v *circuitValues) signs(wantPeak bool) (s [3]float64, peakTime float64) {
	if !v.plain() {
		return v.extended(wantPeak, -1)
	}
	r := v.respond()
	s[ringAt], s[decayAt] = r.ringSigns()
	if !wantPeak {
		return s, math.Inf(1)
	}
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
	if v.plain() && (v[atCs] == 0 || v[atRs] == 0) {
		if d, ok := v.pairSlopes(peakTime); ok {
			return d
		}
	}
	const rel = 3e-6 // balances the third derivative's part against rounding
	if !v.plain() {
		return v.extendedSlopes(peakTime)
	}
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

// extendedSlopes is slopes where effects are in play, by forward differences: each value costs one circuit more, and a step
// of 1e-7 leaves seven digits.
func (v *circuitValues) extendedSlopes(peakTime float64) (d [3]circuitValues) {
	const rel = 1e-7
	endless := math.IsInf(peakTime, 1)
	at, _ := v.extended(!endless, peakTime)
	for k := atL; k <= atShare; k++ {
		h := rel * v[k]
		if k == atR {
			h = rel * math.Max(v[k], 0.01*math.Sqrt(v[atL]/v[atC]))
		}
		if h == 0 {
			continue
		}
		moved := *v
		moved[k] += h
		b, _ := moved.extended(!endless, peakTime)
		for q := range d {
			d[q][k] = (b[q] - at[q]) / h
		}
	}
	if endless {
		d[peakAt] = circuitValues{atE: 1}
	}
	return d
}

// pairSlopes is slopes where nothing or a capacitor alone is fitted, in closed form; ok is false where that does not ring.
// With d = r/(2 L), w^2 = 1/(L Ct) - d^2, Ct = C + Cs and b = I0/Ct,
//
//	v(t) = E + exp(-d t) (-E cos(w t) + (b - d E)/w sin(w t))
func (v *circuitValues) pairSlopes(peakTime float64) (out [3]circuitValues, ok bool) {
	l, ct, r, e := v[atL], v[atC]+v[atCs], v[atR], v[atE]
	d := r / (2 * l)
	w02 := 1 / (l * ct)
	w2 := w02 - d*d
	if !(w2 > 0) {
		return out, false
	}
	w := math.Sqrt(w2)
	b := v[atI0] / ct
	// Derivatives of w, d and b by L, Ct and r.
	dByL, dByR := -d/l, 1/(2*l)
	wByL, wByC, wByR := (-w02/l-2*d*dByL)/(2*w), -w02/ct/(2*w), -2*d*dByR/(2*w)
	bByC := -b / ct
	var byW, byD, byB float64
	if math.IsInf(peakTime, 1) {
		out[peakAt][atE] = 1
	} else {
		t := peakTime
		sin, cos := math.Sincos(w * t)
		ex := math.Exp(-d * t)
		amp := (b - d*e) / w
		byB = ex * sin / w
		byD = -t*ex*(-e*cos+amp*sin) - e*byB
		byW = ex * (e*t*sin + amp*t*cos - amp/w*sin)
		out[peakAt][atI0] = byB / ct
		out[peakAt][atE] = 1 - ex*cos - d*byB
	}
	out[ringAt][atL], out[ringAt][atC], out[ringAt][atR] = wByL/(2*math.Pi), wByC/(2*math.Pi), wByR/(2*math.Pi)
	if d > 0 {
		out[decayAt][atL], out[decayAt][atR] = -dByL/(d*d), -dByR/(d*d)
	}
	out[peakAt][atL] = byW*wByL + byD*dByL
	out[peakAt][atC] = byW*wByC + byB*bByC
	out[peakAt][atR] = byW*wByR + byD*dByR
	if v[atCs] > 0 {
		for k := range out {
			out[k][atCs] = out[k][atC]
		}
	}
	return out, true
}
