package waveform

import (
	"context"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/dsp/fourier"
	"gonum.org/v1/gonum/floats"
)

// addModes looks in what the curve leaves for a second tone and for a level still settling, and keeps what explains more
// than noise would, once in ten thousand records, among all frequencies looked at.
func (c coarse) addModes(ctx context.Context, at *curve, others []tone) *curve {
	if !hasSecond(at) {
		at = c.addTone(ctx, at, others, c.noise(at))
	}
	if !hasPlain(at) {
		at = c.addPlain(ctx, at, c.noise(at))
		if hasPlain(at) && !hasSecond(at) { // which it may have hidden
			at = c.addTone(ctx, at, others, c.noise(at))
		}
	}
	return c.dropPlain(ctx, at)
}

// dropPlain takes a plain exponential off again that is not worth its two numbers beside what else was found, or that is no more
// than a slope or a sample.
func (c coarse) dropPlain(ctx context.Context, at *curve) *curve {
	if !hasPlain(at) {
		return at
	}
	last := len(at.modes) - 1
	less, ok := refine(ctx, c.series, at.modes[:last])
	if !ok || !isRing(less.modes[0]) {
		return at
	}
	noise, g := c.noise(at), at.modes[last].d
	if g < 0.2/float64(len(c.y)) || g > 3 || less.rss-at.rss < noise*noise*worth(10, 2) {
		return less
	}
	return at
}

func hasPlain(at *curve) bool { return at.modes[len(at.modes)-1].w == 0 }

func hasSecond(at *curve) bool { return len(at.modes) > 1 && at.modes[1].w != 0 }

// worth is the fall of the residual, in noise variances, that k more numbers must bring: what chance brings to one record in
// 10,000 among n places looked at (a bound on the tail of chi-square, each of k/2 pairs of numbers adding to it).
func worth(n, k int) float64 { return 2*math.Log(float64(n)/1e-4) + 4*float64(k) }

// addPlain tries a plain exponential beside the level.
func (c coarse) addPlain(ctx context.Context, at *curve, noise float64) *curve {
	n := float64(len(c.y))
	d := at.modes[0].d
	var best *curve
	var bestMode mode
	for _, g := range []float64{2 / n, 0.4 * d, 1.5 * d, 4 * d} {
		if !(g > 0) || !plausible(mode{d: g}, len(c.y)) {
			continue
		}
		try, ok := held(c.series, append(at.modes[:len(at.modes):len(at.modes)], mode{d: g}))
		if ok && (best == nil || try.rss < best.rss) {
			best, bestMode = try, mode{d: g}
		}
	}
	if best == nil || at.rss-best.rss < 0.3*noise*noise*worth(10, 2) {
		return at
	}
	next, ok := refine(ctx, c.series, append(at.modes[:len(at.modes):len(at.modes)], bestMode))
	if !ok || at.rss-next.rss < noise*noise*worth(10, 2) || !isRing(next.modes[0]) || !c.spreads(at, next, noise*noise*worth(10, 2)) {
		return at
	}
	if g := next.modes[len(next.modes)-1].d; g < 0.2/n || g > 3 { // a slope without an end, or two samples
		return at
	}
	if math.Abs(real(next.amp[len(next.amp)-1])) > 20*cmplx.Abs(at.amp[0])+20*noise {
		return at // it and the level cancel: nothing is known of either
	}
	return next
}

// addTone tries a second tone where the spectrum of what is left stands highest.
func (c coarse) addTone(ctx context.Context, at *curve, others []tone, noise float64) *curve {
	line, ok := c.leftTone(at, noise)
	if !ok {
		return at
	}
	starts := []mode{line}
	for _, t := range others {
		if w := t.w * float64(c.m); math.Abs(w-at.modes[0].w) > 0.05*at.modes[0].w && w < 2.5 && len(starts) < 3 {
			starts = append(starts, mode{t.d * float64(c.m), w})
		}
	}
	var best *curve
	for _, s := range starts {
		modes := append([]mode{at.modes[0], s}, at.modes[1:]...)
		next, ok := refine(ctx, c.series, modes)
		if !ok || !c.stands(next, at, noise) {
			continue
		}
		if best == nil || next.rss < best.rss {
			best = next
		}
	}
	if best == nil {
		return at
	}
	return best.ordered(c.series)
}

// ordered puts the tone of more energy first.
func (c *curve) ordered(in series) *curve {
	if !hasSecond(c) || c.energy(0) >= c.energy(1) {
		return c
	}
	if swapped, ok := held(in, append([]mode{c.modes[1], c.modes[0]}, c.modes[2:]...)); ok {
		return swapped
	}
	return c
}

// harmonic says whether the second tone is the first's own: at twice its frequency, as a capacitance that changes with
// voltage makes it.
func (c *curve) harmonic() bool {
	return hasSecond(c) && math.Abs(c.modes[1].w-2*c.modes[0].w) < 0.03*c.modes[1].w && c.modes[1].d > 1.3*c.modes[0].d
}

// energy of tone k, V^2 samples, to a factor.
func (c *curve) energy(k int) float64 {
	a := cmplx.Abs(c.amp[k])
	return a * a / max(c.modes[k].d, 1/float64(c.n))
}

// stands says whether the second tone is one: it explains enough, swings and dies away, is seen for a cycle, and is no
// twin of the first that only bends its shape.
func (c coarse) stands(next, at *curve, noise float64) bool {
	one, two := next.modes[0], next.modes[1]
	noise = max(min(noise, c.noise(next)*1.5), c.floor())
	if at.rss-next.rss < noise*noise*worth(len(c.y), 4) {
		return false
	}
	return twoTones(one, two, len(c.y)) && c.spreads(at, next, noise*noise*worth(len(c.y), 4)) && cmplx.Abs(next.amp[0])+cmplx.Abs(next.amp[1]) < 5*c.swing()
}

// spreads says whether next leaves less than at not only around a few samples, as a curve bent towards a glitch does: without the
// four samples that gain most there must be enough, and a third of the whole.
func (c coarse) spreads(at, next *curve, enough float64) bool {
	gain := make([]float64, 0, len(c.y))
	at.walk(c.series, func(_ int, e []float64) {
		for _, v := range e {
			gain = append(gain, v*v)
		}
	})
	whole := 0.0
	next.walk(c.series, func(t int, e []float64) {
		for i, v := range e {
			gain[t+i] -= v * v
			whole += gain[t+i]
		}
	})
	rest := whole
	for range 4 {
		k := floats.MaxIdx(gain)
		rest -= max(gain[k], 0)
		gain[k] = 0
	}
	return rest > enough && rest > whole/3
}

// twoTones says whether two modes are two: each swings and dies away, the second within the samples, and they are further
// apart than they are wide.
func twoTones(one, two mode, n int) bool {
	return isRing(one) && isRing(two) && one.d > 0 && two.d > 0 && two.d < two.w && two.w*float64(n) > 2*math.Pi &&
		math.Abs(one.w-two.w) > 0.8*(one.d+two.d) && math.Abs(one.w-two.w) > 0.03*one.w && two.w < 0.9*math.Pi
}

// swing is half of the highest less the lowest, V.
func (c coarse) swing() float64 {
	low, high := math.Inf(1), math.Inf(-1)
	for _, v := range c.y {
		low, high = min(low, v), max(high, v)
	}
	return (high - low) / 2
}

// leftTone is the highest line in the spectrum of what the curve leaves, seen through windows that fall as a ring does.
func (c coarse) leftTone(at *curve, noise float64) (mode, bool) {
	n := min(len(c.y), 2048)
	size := 64
	for size < n {
		size *= 2
	}
	left := make([]float64, 0, len(c.y))
	at.walk(c.series, func(_ int, e []float64) { left = append(left, e...) })
	fft := fourier.NewFFT(size)
	buf := make([]float64, size)
	var line []complex128
	var best mode
	highest := 0.0
	for _, g := range []float64{0.5, 2} {
		d := max(g*at.modes[0].d, 1/float64(n))
		weight := 0.0
		e, r := 1.0, math.Exp(-d)
		for i := range n {
			buf[i] = left[i] * e
			weight += e * e
			e *= r
		}
		clear(buf[n:])
		line = fft.Coefficients(line, buf)
		low := max(2, int(float64(size)/float64(n)))
		for k := low; k < len(line)*9/10; k++ {
			a := real(line[k])*real(line[k]) + imag(line[k])*imag(line[k])
			if a /= weight; a > highest {
				highest, best = a, mode{d, 2 * math.Pi * float64(k) / float64(size)}
			}
		}
	}
	return best, highest > noise*noise*math.Log(float64(n)/1e-3)
}
