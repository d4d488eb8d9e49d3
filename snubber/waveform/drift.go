package waveform

import (
	"context"
	"math"
)

// drifts fits the ring's first e-folding and the rest each for itself, with all else of the curve taken off: a frequency
// that moves through the record is not one number, and its uncertainty must say so.
func (r *reader) drifts(ctx context.Context) {
	c := r.ring.curve
	main := c.modes[0]
	if main.d <= 0 || hasSecond(c) && !c.harmonic() {
		return
	}
	half := int(max(1/main.d, 2*main.period()))
	if r.ring.start+2*half > r.ring.end {
		return
	}
	in := r.p.samples(r.ring.start, min(r.ring.end, r.ring.start+6*half))
	rest := curve{modes: c.modes[1:], amp: c.amp[1:], level: c.level}
	alone := make([]float64, 0, len(in.y))
	rest.walk(in, func(_ int, e []float64) { alone = append(alone, e...) })
	first, ok := inPart(ctx, series{alone[:half], 0, in.room}, main)
	if !ok {
		return
	}
	later, ok := inPart(ctx, series{alone[half:], 0, in.room}, main)
	if !ok {
		return
	}
	noise := r.e.NoiseV
	d := later.w - first.w
	if u := noise * math.Hypot(first.u, later.u); math.Abs(d) > 4*u && math.Abs(d) > 2e-4*main.w && noise*later.u < 0.01*main.w {
		r.drift, r.driftD = d/(2*math.Pi*r.Interval), later.d-first.d
	}
}

// part is a mode read from a part of a record: d and w per sample, and w's standard uncertainty in noise of 1 V.
type part struct{ d, w, u float64 }

// inPart fits a stretch for its own frequency.
func inPart(ctx context.Context, in series, near mode) (part, bool) {
	c, ok := refine(ctx, in, []mode{near})
	if !ok {
		return part{}, false
	}
	one := reader{ring: &ring{curve: c}, cov: c.sol.inverse()}
	return part{d: c.modes[0].d, w: c.modes[0].w, u: one.modeU(0).w}, true
}
