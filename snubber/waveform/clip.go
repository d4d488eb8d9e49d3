package waveform

import "math"

// clip is the longest run of samples on the highest or the lowest value, where it is too flat for a ring's turn, and the
// sample after the last such run.
type clip struct{ longest, end int }

// clipped looks at the samples from i to the ring's end for both ends of the range. A cosine stays within one step (the
// converter's, or the noise) of its top for sqrt(2 step/height) radians to either side; a run well longer is no turn.
func (r *ring) clipped(p prefix, i int, step float64) (c clip) {
	span := p.spread()
	step = max(step, r.noise)
	for _, sign := range []float64{1, -1} {
		extreme := max(sign*p.low, sign*p.high)
		height := extreme - sign*(r.curve.level+p.ref)
		if height < 4*step || height < 0.02*span {
			continue // the level itself
		}
		turn := 2 * math.Sqrt(2*step/height) * r.curve.modes[0].period() / (2 * math.Pi)
		run := 0
		for k := i; k < r.end; k++ {
			if sign*p.v[k] < extreme-1e-9*span {
				run = 0
				continue
			}
			if run++; run >= 3 && float64(run) > 2+1.6*turn {
				c.longest, c.end = max(c.longest, run), max(c.end, k+1)
			}
		}
	}
	return c
}
