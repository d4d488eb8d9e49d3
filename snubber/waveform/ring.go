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
	past       int     // the last onset that the fit went over, where it did
	misfit     bool    // the samples after the start do not follow the curve as closely as the later ones
}

// meanSquare of what the fit leaves, V^2.
func (r *ring) meanSquare() float64 { return r.curve.rss / float64(r.curve.n) }

// amplitude of the ring at its start, V.
func (r *ring) amplitude() float64 { return cmplx.Abs(r.curve.amp[0]) }

// perCycle is the samples in which the search works: enough to keep all that a cycle tells, few enough to be quick.
const perCycle = 24

// coarse is a stretch of the record in means over m samples.
type coarse struct {
	p     prefix
	m     int
	first int // the record's sample
	series
	step float64 // V: the converter's, 0: none
	weak bool    // the noise does not carry a level over the converter's steps
}

func (p prefix) coarse(first, to, m int, step float64) coarse {
	return coarse{p: p, m: m, first: first, series: p.means(first, m, max(0, (to-first)/m)), step: step}
}

// means is n means over m samples each, from i on.
func (p prefix) means(i, m, n int) series {
	if m == 1 {
		return p.samples(i, i+n)
	}
	return series{p.blocks(i, m, n), 0, p.room}
}

// floor is the least noise to believe in a mean: what quantisation makes, or the rounding of the samples.
func (c coarse) floor() float64 { return max(c.step/math.Sqrt(12*float64(c.m)), c.p.tiny) }

// noise of a mean, V, by what the curve leaves.
func (c coarse) noise(at *curve) float64 { return max(at.residual(c.series).quiet(), c.floor()) }

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
		if !r.misfit && r.noise < 3*max(step/math.Sqrt(12), quickNoise(p.v[r.start:min(r.start+4096, r.end)])) {
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
	var best *attempt
	modes := []mode{{t.d * float64(m), t.w * float64(m)}}
	for try := range 16 {
		begin := safe + int(float64(try)*t.period()/4)
		if end-begin < 12*m || float64(end-begin) < 1.2*t.period() && try > 0 {
			break
		}
		a := p.attempt(ctx, begin, end, m, step, weak, modes, others)
		if a == nil {
			if best == nil && try < 3 {
				continue
			}
			break
		}
		if best != nil && a.amplitude() < 10*a.noise {
			break
		}
		if best == nil || a.front < best.front {
			best = a
		}
		modes = a.curve.modes
		if a.front < 1 {
			break
		}
	}
	if best == nil {
		return nil
	}
	view, c := best.view, best.curve
	if best.front < 1 {
		view, c = view.growBack(ctx, c, least)
		c = view.addModes(ctx, c, others)
	}
	return p.finish(ctx, view, c, least, to, step, best.front >= 1)
}

// attempt is a fit from one start.
type attempt struct {
	view  coarse
	curve *curve
	noise float64 // V: of a mean
	front float64 // how far the first half cycle is off, as a share of what is allowed
}

func (a *attempt) amplitude() float64 { return cmplx.Abs(a.curve.amp[0]) }

func (p prefix) attempt(ctx context.Context, begin, end, m int, step float64, weak bool, modes []mode, others []tone) *attempt {
	view := p.coarse(begin, end, m, step)
	view.weak = weak
	c, ok := refine(ctx, view.series, modes)
	if !ok || !isRing(c.modes[0]) {
		return nil
	}
	if weak {
		if n := view.crossesSteps(c); n < len(view.y) {
			view.y = view.y[:n]
			if c, ok = refine(ctx, view.series, c.modes); !ok || !isRing(c.modes[0]) {
				return nil
			}
		}
	}
	c = view.addModes(ctx, c, others)
	a := &attempt{view: view, curve: c, noise: view.noise(c)}
	a.front = view.frontOff(c, a.noise)
	return a
}

// isRing says whether a mode swings at all before it is gone: a damping ratio below 0.8.
func isRing(m mode) bool { return m.w > 0 && m.d < 1.33*m.w && m.d > -0.05*m.w }

// slack is how far, as a share of the ring, samples may lie off the curve and still be of it: no real ring is exactly linear.
const slack = 0.002

// frontOff is how large the first half cycle is left, over what noise and slack allow.
func (c coarse) frontOff(at *curve, noise float64) float64 {
	n := min(len(c.y), max(4, int(at.modes[0].period()/2)))
	front := 0.0
	head := c.series
	head.y = head.y[:n]
	at.walk(head, func(_ int, e []float64) {
		for _, v := range e {
			front += v * v
		}
	})
	allowed := slack * cmplx.Abs(at.amp[0])
	// the mean square of n of them, and five standard deviations of it
	return front / float64(n) / ((noise*noise + allowed*allowed) * (1 + 5*math.Sqrt(2/float64(n))))
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
		grown.series = c.p.means(grown.first, c.m, len(c.y)+take)
		next, ok := refine(ctx, grown.series, at.modes)
		if !ok || !isRing(next.modes[0]) {
			break
		}
		c, at = grown, next
	}
	return c, at
}

// onCurve is how many of the chunk means before the curve's start follow it. Each lies off by the noise and by what the
// curve, drawn on past its samples, may be wrong by. The squares of that, less three, are summed from nought up
// (Page, "Continuous inspection schemes", Biometrika 41, 100 (1954), from memory): at 25 the curve is left, and it
// was left where the sum began to grow.
func (c coarse) onCurve(at *curve, chunk int) int {
	noise := c.noise(at)
	allowed := math.Hypot(noise, slack*cmplx.Abs(at.amp[0]))
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
		off := before[chunk-k] - at.at(t)
		sum += off*off/(allowed*allowed+lever*noise*noise) - 3
		if sum <= 0 {
			sum, began = 0, k
		}
		if sum > 25 {
			return began
		}
	}
	return chunk
}
