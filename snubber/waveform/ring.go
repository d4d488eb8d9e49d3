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

// variance of what the fit leaves, V^2, and its degrees of freedom.
func (r *ring) variance() (v, dof float64) {
	dof = float64(max(1, r.curve.n-r.curve.parameters()))
	return r.curve.rss / dof, dof
}

// asGoodAs says whether r leaves no more, sample for sample, than the fit of fewer samples that other is, or where there is none
// than its own noise: a third more at most, beside four standard deviations of what chance makes of few samples.
func (r *ring) asGoodAs(other *ring) bool {
	v, dof := r.variance()
	least := r.noise * r.noise
	if other != nil {
		least, dof = other.variance()
	}
	return v < least*(1.3+4*math.Sqrt(2/dof))
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
	weak := p.weakDither(step, to-(to-o.at)/4, to)
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
		// Noise may turn the fit of a few cycles so that the samples before seem to leave it: from another start they may not.
		for again := 1; again < 3 && view.first > max(o.at-o.scale, least)+int(t.period()/8); again++ {
			a := p.attempt(ctx, best.view.first+int(float64(again)*t.period()/4), end, m, step, weak, c.modes, others)
			if a == nil || a.front >= 1 || a.amplitude() < 5*a.noise {
				break
			}
			if v, grown := a.view.growBack(ctx, a.curve, least); v.first < view.first {
				view, c = v, grown
			}
		}
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
