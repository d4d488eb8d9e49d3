package waveform

import (
	"context"
	"math"
	"math/cmplx"
)

// finish fits the samples themselves, from the instant at which they join the curve, as far as the ring lasts, and says
// whether a ring stands out of the noise; nil where none does.
func (p prefix) finish(ctx context.Context, c coarse, at *curve, least, to int, step float64, misfit bool) *ring {
	m := float64(c.m)
	modes := make([]mode, len(at.modes))
	for k, x := range at.modes {
		modes[k] = mode{x.d / m, x.w / m}
	}
	noise := c.noise(at) * math.Sqrt(m)
	r := &ring{start: c.first, end: p.lasts(c, at, to, noise), noise: noise, misfit: misfit}
	v := p.samples(r.start, r.end)
	full, ok := refine(ctx, v, modes)
	if k := len(modes) - 1; !ok && modes[k].w == 0 {
		full, ok = refine(ctx, v, modes[:k])
	}
	if ok && hasSecond(full) && !twoTones(full.modes[0], full.modes[1], len(v.y)) { // it has turned into the first's twin
		full, ok = refine(ctx, v, append([]mode{modes[0]}, full.modes[2:]...))
	}
	if !ok || !isRing(full.modes[0]) {
		return nil
	}
	full = p.coarse(r.start, r.end, 1, step).dropPlain(ctx, full)
	r.curve = full
	if !misfit {
		p.joins(ctx, r, least, step)
	}
	r.curve = r.curve.ordered(p.samples(r.start, r.end))
	if r.curve.modes[0].d*float64(r.end-r.start) < -1 { // what grows is no ring
		return nil
	}
	if !p.standsOut(ctx, r, step) {
		return nil
	}
	return r
}

// lasts is the sample up to which to fit: 14 e-foldings of the ring, or all there is where that lies on the level the ring
// settles at.
func (p prefix) lasts(c coarse, at *curve, to int, noise float64) int {
	end := c.first + len(c.y)*c.m
	if c.weak || to-end < 4*c.m {
		return end
	}
	tail := p.mean(end, to)
	if math.Abs(tail-at.level) < 4*noise/math.Sqrt(float64(to-end))+3*noise/math.Sqrt(float64(len(c.y)*c.m)) {
		return to
	}
	return end
}

// crossesSteps is how many means to fit where the noise does not carry a level over the converter's steps: as long as
// the ring does. What comes after is one code, off the level by up to half a step.
func (c coarse) crossesSteps(at *curve) int {
	main := at.modes[0]
	if !(main.d > 0) {
		return len(c.y)
	}
	n := max(math.Log(max(2*cmplx.Abs(at.amp[0])/c.step, 1))/main.d, 2*main.period(), float64(4*at.parameters()))
	return int(min(n, float64(len(c.y))))
}

// weakDither says whether the noise in samples i to j-1, at most some thousands of the last, is too small to spread a level over
// the converter's codes: a standard deviation under 0.4 of a step, from where on the mean of the codes is off by more than a
// hundredth of a step; or a level between two codes, and no others seen. Where samples are too few to tell it is.
func (p prefix) weakDither(step float64, i, j int) bool {
	if step == 0 {
		return false
	}
	i = max(i, j-4096)
	if j-i < 16 {
		return true
	}
	mean := p.mean(i, j)
	low, high := extremes(p.v[i:j])
	squares := 0.0
	for _, v := range p.v[i:j] {
		d := v - p.ref - mean
		squares += d * d
	}
	return math.Sqrt(squares/float64(j-i-1)) < 0.4*step || high-low < 1.5*step
}

// joins moves the start, a sample at a time, to where the samples join the curve: back while they lie on it, then on past
// those that lie rather on the flat before the edge.
func (p prefix) joins(ctx context.Context, r *ring, least int, step float64) {
	one := p.coarse(r.start, r.end, 1, step)
	back := min(r.start-least, int(max(4, r.curve.modes[0].period()/8)))
	take := 0
	if back > 0 {
		take = one.onCurve(r.curve, back)
	}
	move := take
	move -= p.flat(r, take)
	if move == 0 {
		return
	}
	start := r.start - move
	next, ok := refine(ctx, p.samples(start, r.end), r.curve.modes)
	if !ok || !isRing(next.modes[0]) {
		return
	}
	r.start, r.curve = start, next
}

// flat is how many of the samples from take before the start on lie rather on the level before the edge, where there is one,
// than on the curve.
func (p prefix) flat(r *ring, take int) int {
	first := r.start - take
	from := max(0, first-64)
	if first-2-from < 8 {
		return 0
	}
	level := p.mean(from, first-2)
	squares := 0.0
	for k := from; k < first-2; k++ {
		d := p.v[k] - p.ref - level
		squares += d * d
	}
	if squares/float64(first-2-from) > 4*r.noise*r.noise {
		return 0
	}
	sum, least, n := 0.0, 0.0, 0
	span := int(r.curve.modes[0].period() / 8)
	for k := range take + span {
		if first+k >= r.end {
			break
		}
		v := p.v[first+k] - p.ref
		on := v - r.curve.at(float64(k-take))
		sum += (v-level)*(v-level) - on*on
		if sum < least {
			least, n = sum, k+1
		}
	}
	// Where the curve leaves the flat without a jump, samples near there are as like the one as the other: it is left where they touch.
	off := func(k int) float64 { return math.Abs(r.curve.at(float64(k-take)) - level) }
	for n < take+span && off(n) < 1.5*r.noise && off(n+1) < off(n) {
		n++
	}
	for n > 0 && off(n-1) < 1.5*r.noise && off(n-1) < off(n) {
		n--
	}
	return n
}

// falseAlarm is the chance that a record without a ring is said to ring, at most.
const falseAlarm = 1e-3

// standsOut tests the ring, without its first half cycle (an edge may look like half a cycle of anything), against a
// level with up to two plain exponentials: it must lower the residual by more than noise would at any frequency, damping
// and start, but once in a thousand records.
func (p prefix) standsOut(ctx context.Context, r *ring, step float64) bool {
	main := r.curve.modes[0]
	m := max(1, int(2*main.period()/perCycle))
	begin := r.start + int(main.period()/2)
	end := r.end
	if main.d > 0 { // what comes after six e-foldings tells nothing
		end = min(end, begin+int(6/main.d)+8*m)
	}
	c := p.coarse(begin, end, m, step)
	if len(c.y) < 3*len(r.curve.modes)+8 || float64(r.end-r.start) < 1.25*main.period() {
		return false
	}
	scaled := make([]mode, len(r.curve.modes))
	for k, x := range r.curve.modes {
		scaled[k] = mode{x.d * float64(m), x.w * float64(m)}
	}
	with, ok := held(c.series, scaled)
	if !ok {
		return false
	}
	without, ok := held(c.series, scaled[1:])
	if !ok {
		return false
	}
	bare := without.rss
	for _, g := range []float64{0.5, 2} {
		d := g * max(scaled[0].d, 0.2*scaled[0].w)
		for _, plain := range [][]mode{{{d: d}}, {{d: d}, {d: 3 * d}}} {
			if !plausible(plain[len(plain)-1], len(c.y)) {
				continue
			}
			bent, ok := refine(ctx, c.series, append(plain, scaled[1:]...))
			if ok && !takesPlace(bent.modes, scaled[0]) {
				bare = min(bare, bent.rss)
			}
		}
	}
	noise := max(math.Sqrt(with.rss/float64(max(1, len(c.y)-with.parameters()))), c.floor())
	gain := (bare - with.rss) / (noise * noise)
	return gain > 2*math.Log(16*float64(len(c.y)*m)/falseAlarm)+8
}

// takesPlace says whether another tone has moved to where the ring was.
func takesPlace(modes []mode, ring mode) bool {
	for _, m := range modes {
		if m.w != 0 && math.Abs(m.w-ring.w) < max(ring.d, 0.03*ring.w) {
			return true
		}
	}
	return false
}
