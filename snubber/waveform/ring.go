package waveform

import (
	"context"
	"math"
	"math/cmplx"
)

// ring is a curve found in the samples start to end-1 of a record; the first of its modes is the ring.
type ring struct {
	start, end int
	curve      *curve
	noise      float64 // V: of one sample, standard deviation
	misfit     bool    // the samples after the start do not follow the curve as closely as the later ones
}

// amplitude of the ring at its start, V.
func (r *ring) amplitude() float64 { return cmplx.Abs(r.curve.amp[0]) }

// perCycle is the samples in which the search works: enough to keep all that a cycle tells, few enough to be quick.
const perCycle = 24

// coarse is a stretch of the record in means over m samples.
type coarse struct {
	p     prefix
	m     int
	first int // the record's sample
	y     []float64
	step  float64 // V: the converter's, 0: none
	weak  bool    // the noise does not carry a level over the converter's steps
}

func (p prefix) coarse(first, to, m int, step float64) coarse {
	return coarse{p: p, m: m, first: first, y: p.blocks(first, m, max(0, (to-first)/m)), step: step}
}

// floor is the least noise to believe in a mean: what quantisation makes, or the rounding of the samples.
func (c coarse) floor() float64 {
	span := 0.0
	for _, v := range c.y {
		span = max(span, math.Abs(v))
	}
	return max(c.step/math.Sqrt(12*float64(c.m)), 1e-9*span)
}

// noise of a mean, V, by what the curve leaves.
func (c coarse) noise(at *curve) float64 { return max(at.residual(c.y).quiet(), c.floor()) }

// findRing fits a ring to what follows the edge at from, and before to; the samples before the edge may be taken in
// down to least. It gives none where no fit stands.
func (p prefix) findRing(ctx context.Context, o onset, least, to int, step float64) *ring {
	var best *ring
	bestLeft := math.Inf(1)
	ts := p.tones(o.at, to)
	for i, t := range ts[:min(len(ts), 3)] {
		if i > 0 && t.energy < 0.05*ts[0].energy || ctx.Err() != nil {
			break
		}
		r := p.fitTone(ctx, t, ts, o, least, to, step)
		if r == nil {
			continue
		}
		// The better of two is what leaves less of the same samples.
		left := r.noise
		if best == nil || left < 0.8*bestLeft || left < 1.2*bestLeft && r.start < best.start && r.amplitude() > best.amplitude() {
			best, bestLeft = r, left
		}
		if !r.misfit && r.noise < 3*max(step/math.Sqrt(12), quickNoise(p.blocks(r.start, 1, min(4096, r.end-r.start)))) {
			break
		}
	}
	return best
}

// fitTone starts a cycle or so after the edge, where the edge itself is over, and grows the fit back towards it.
func (p prefix) fitTone(ctx context.Context, t tone, others []tone, o onset, least, to int, step float64) *ring {
	m := max(1, int(t.period()/perCycle))
	safe := o.at + max(1, int(min(0.6*t.period(), 0.8/max(t.d, 1e-9))))
	end := min(to, safe+int(min(14/max(t.d, 1e-9), 8192*float64(m))))
	weak := weakDither(step, p.tailNoise(to-(to-o.at)/4, to))
	var view coarse
	var c *curve
	misfit := true
	var original *ring
	for try := 0; try < 8; try++ {
		begin := safe + int(float64(try)*t.period()/4)
		if end-begin < 12*m || float64(end-begin) < 1.2*t.period() && try > 0 {
			break
		}
		view = p.coarse(begin, end, m, step)
		start := []mode{{t.d * float64(m), t.w * float64(m)}}
		if c != nil {
			start = c.modes
		}
		found, ok := refine(ctx, view.y, start, 0)
		if !ok || !isRing(found.modes[0]) {
			if c == nil && try < 3 {
				continue
			}
			break
		}
		if view.weak = weak; weak {
			if n := view.crossesSteps(found); n < len(view.y) {
				view.y = view.y[:n]
				end = begin + n*m
				if found, ok = refine(ctx, view.y, found.modes, 0); !ok || !isRing(found.modes[0]) {
					break
				}
			}
		}
		found = view.addModes(ctx, found, others)
		noise := view.noise(found)
		r := &ring{start: begin, end: end, curve: found, noise: noise * math.Sqrt(float64(m)), misfit: true}
		if original == nil {
			original = r
		}
		if try > 0 && r.amplitude() < 10*noise {
			break
		}
		c = found
		if view.frontFits(found, noise) {
			misfit = false
			break
		}
	}
	if original == nil {
		return nil
	}
	if misfit {
		view = p.coarse(original.start, original.end, m, step)
		view.weak = weak
		c = original.curve
	} else {
		view, c = view.growBack(ctx, c, least)
		c = view.addModes(ctx, c, others)
	}
	return p.finish(ctx, view, c, least, to, step, misfit)
}

// isRing says whether a mode swings at all before it is gone: a damping ratio below 0.8.
func isRing(m mode) bool { return m.w > 0 && m.d < 1.33*m.w && m.d > -0.05*m.w }

// frontFits says whether the first half cycle is left as small as the rest.
func (c coarse) frontFits(at *curve, noise float64) bool {
	n := min(len(c.y), max(4, int(at.modes[0].period()/2)))
	front := 0.0
	head := *at
	head.walk(c.y[:n], func(_ int, e []float64) {
		for _, v := range e {
			front += v * v
		}
	})
	// the mean square of n of them, less what the fit took up, and five standard deviations of it
	return front/float64(n) < noise*noise*(1+5*math.Sqrt(2/float64(n)))
}

// growBack takes in samples before the curve's start as long as they lie on it, a quarter of a cycle at a time.
func (c coarse) growBack(ctx context.Context, at *curve, least int) (coarse, *curve) {
	for ctx.Err() == nil {
		chunk := max(3, int(at.modes[0].period()/4))
		chunk = min(chunk, (c.first-least)/c.m)
		if chunk < 1 {
			break
		}
		take := c.onCurve(at, chunk)
		if take == 0 {
			break
		}
		grown := c
		grown.first -= take * c.m
		grown.y = append(c.p.blocks(grown.first, c.m, take), c.y...)
		next, ok := refine(ctx, grown.y, at.modes, 0)
		if !ok || !isRing(next.modes[0]) {
			break
		}
		c, at = grown, next
		if take < chunk {
			break
		}
	}
	return c, at
}

// onCurve is how many of the chunk means before the curve's start follow it. Each lies off by the noise and by what the
// curve, drawn on past its samples, may be wrong by. The squares of that, less three, are summed from nought up
// (Page, "Continuous inspection schemes", Biometrika 41, 100 (1954), from memory): at 16 the curve is left, and it
// was left where the sum began to grow.
func (c coarse) onCurve(at *curve, chunk int) int {
	noise := c.noise(at)
	inverse := at.sol.inverse()
	before := c.p.blocks(c.first-chunk*c.m, c.m, chunk)
	sum, began := 0.0, 0
	for k := 1; k <= chunk; k++ {
		t := -float64(k)
		x, n := row(at.modes, t)
		lever := 0.0
		for i := range n {
			for j := range n {
				lever += x[i] * x[j] * inverse[i][j]
			}
		}
		off := (before[chunk-k] - at.at(t)) / noise
		sum += off*off/(1+lever) - 3
		if sum <= 0 {
			sum, began = 0, k
		}
		if sum > 16 {
			return began
		}
	}
	return chunk
}
