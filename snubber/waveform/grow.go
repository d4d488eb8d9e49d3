package waveform

import (
	"context"
	"math"
	"math/cmplx"
)

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
