package waveform

import "math"

// peak finds the highest voltage: by the samples, and by a curve near the top, which has not the bias of the highest of
// many noisy samples.
func (r *reader) peak() {
	v := r.Volts
	top := 0
	for i, x := range v {
		if x > v[top] {
			top = i
		}
	}
	r.e.PeakSampleV = v[top]
	value, u, by := r.peakByRing()
	local, localU, ok := r.peakLocally(top)
	if !by || ok && math.Abs(value-local) > 5*math.Hypot(u, localU)+r.step && (value < local || r.perCycle() > 12) {
		if ok {
			value, u, by = local, localU, true
		}
	}
	if !by {
		value, u = v[top], max(r.e.NoiseV, r.step/math.Sqrt(12))
	}
	r.e.PeakFitV = value
	r.e.PeakV = figure(value, max(u, 1e-12*r.e.spread), max(r.dof, 8))
}

func (r *reader) perCycle() float64 {
	if r.ring == nil {
		return math.Inf(1)
	}
	return r.ring.curve.modes[0].period()
}

// peakByRing is the top of the fitted curve, where the highest voltage lies on it: not lower than all samples outside it.
func (r *reader) peakByRing() (value, u float64, ok bool) {
	if r.ring == nil {
		return 0, 0, false
	}
	c := r.ring.curve
	span := float64(r.ring.end - 1 - r.ring.start)
	look := min(span, 2*c.modes[0].period())
	best, at := c.at(0), 0.0
	fine := c.modes[0].period() / 64
	if hasSecond(c) {
		fine = min(fine, c.modes[1].period()/64)
	}
	for t := 0.0; t <= look; t += fine {
		if x := c.at(t); x > best {
			best, at = x, t
		}
	}
	low, high := max(0, at-fine), min(span, at+fine)
	for range 40 {
		a, b := low+(high-low)/3, high-(high-low)/3
		if c.at(a) < c.at(b) {
			low = a
		} else {
			high = b
		}
	}
	at = (low + high) / 2
	if x := c.at(at); x > best {
		best = x
	}
	best += r.p.ref
	outside := math.Inf(-1)
	for i, x := range r.Volts {
		if i < r.ring.start || i >= r.ring.end {
			outside = max(outside, x)
		}
	}
	if outside > best+4*r.e.NoiseV+r.step {
		return best, 0, false
	}
	return best, r.valueU(at), true
}

// peakLocally fits a parabola around the highest sample: over a sixth of a cycle of a ring, or over the samples that lie
// within the noise of it.
func (r *reader) peakLocally(top int) (value, u float64, ok bool) {
	v := r.Volts
	noise := max(r.e.NoiseV, r.step/math.Sqrt(12))
	width := len(v)
	if r.ring != nil {
		width = int(r.perCycle() / 12)
	}
	near := 8*noise + 1e-3*r.e.spread
	if r.ring != nil {
		near = 8*noise + 0.05*r.e.spread
	}
	from, to := top, top+1
	for from > 0 && top-from < width && v[top]-v[from-1] < near {
		from--
	}
	for to < len(v) && to-top <= width && v[top]-v[to] < near {
		to++
	}
	n := to - from
	if n < 5 {
		return 0, 0, false
	}
	// Least squares of a + b x + c x^2 over x from -1 to 1, by sums of even and odd powers.
	var s [5]float64
	var y [3]float64
	mid, half := float64(n-1)/2, max(float64(n-1)/2, 1)
	for i, x := range v[from:to] {
		t := (float64(i) - mid) / half
		x -= v[top]
		p := 1.0
		for k := range s {
			s[k] += p
			if k < 3 {
				y[k] += p * x
			}
			p *= t
		}
	}
	det := s[0]*s[4] - s[2]*s[2]
	a, b, c := (s[4]*y[0]-s[2]*y[2])/det, y[1]/s[2], (s[0]*y[2]-s[2]*y[0])/det
	at := float64(top-from) - mid
	at /= half
	if c < 0 {
		at = min(1, max(-1, -b/(2*c)))
	}
	variance := (s[4]-2*s[2]*at*at+s[0]*at*at*at*at)/det + at*at/s[2]
	return min(v[top]+noise, v[top]+a+at*(b+at*c)), noise * math.Sqrt(variance), true
}
