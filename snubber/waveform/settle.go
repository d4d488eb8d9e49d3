package waveform

import "math"

// levels finds the level before the edge and after it, the edge's instant and its direction.
func (r *reader) levels() {
	v := r.Volts
	r.e.spread = r.p.spread()
	noise := r.tailNoise()
	settled, u := r.settled(noise)
	r.e.NoiseV = noise
	r.e.SettledV = figure(settled, u, len(v))
	start := r.at.at + r.at.scale
	if r.ring != nil {
		start = r.ring.start
		noise = r.ring.noise
		settled = r.ring.curve.level + r.p.ref
	}
	r.before = min(start, r.at.at) - 2*r.at.scale
	if r.before < 4 {
		r.before = 0
		r.e.EdgeS = r.TimeAt(min(start, len(v)-1))
		if r.ring == nil {
			r.e.EdgeS = r.TimeAt(min(r.at.at, len(v)-1))
		}
		r.e.Rising = settled > v[min(start, len(v)-1)]
		return
	}
	r.low = r.p.mean(max(0, r.before-256), r.before) + r.p.ref
	r.high = settled
	rise := settled - r.low
	if math.Abs(rise) < max(6*noise, 0.02*r.e.spread) { // a ring, or a pulse, about a level that stays
		r.high = r.low
		r.e.EdgeS = r.TimeAt(min(start, len(v)-1))
		r.e.Rising = r.p.mean(min(start, len(v)-1), min(start+max(1, r.at.scale/2), len(v)-1)+1)+r.p.ref > r.low
		return
	}
	r.e.Rising = rise > 0
	t, ok := r.crossing(0.5)
	if !ok {
		t = float64(r.at.at)
	}
	r.e.EdgeS = r.Start + t*r.Interval
}

// crossing is the sample, and a part of one, at which the edge first passes the given share of its way.
func (r *reader) crossing(share float64) (float64, bool) {
	v, level := r.Volts, r.low+share*(r.high-r.low)
	way := math.Copysign(1, r.high-r.low)
	stay := max(1, r.at.scale/8) // a sample of noise may cross; the mean of the next few must be across as well
	for i := r.before + 1; i+stay < len(v); i++ {
		a, b := (v[i-1]-level)*way, (v[i]-level)*way
		if a < 0 && b >= 0 && (r.p.mean(i, i+stay)+r.p.ref-level)*way >= 0 {
			return float64(i-1) + a/(a-b), true
		}
	}
	return 0, false
}

// tailNoise is the noise where nothing rings, V.
func (r *reader) tailNoise() float64 {
	noise := quickNoise(r.Volts)
	if r.step > 0 {
		noise = max(noise, r.step/math.Sqrt(12))
	}
	return noise
}

// settled is the level the record ends on, and its standard uncertainty: the ring's own, or the last tenth's mean.
func (r *reader) settled(noise float64) (float64, float64) {
	n := len(r.Volts)
	last := min(n, max(n/10, 8))
	mean := r.p.mean(n-last, n)
	squares := 0.0
	for _, v := range r.Volts[n-last:] {
		d := v - r.p.ref - mean
		squares += d * d
	}
	sd := max(noise, math.Sqrt(squares/float64(max(1, last-1))))
	u := sd / math.Sqrt(float64(last))
	if r.p.weakDither(r.step, n-last, n) {
		u = max(u, r.step/math.Sqrt(12))
	}
	return mean + r.p.ref, u
}
