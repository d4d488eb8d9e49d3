package waveform

import (
	"context"
	"math"
)

// PlainFit is the least-squares fit alone, of one tone to all samples, from a start: for comparison with others' fits.
func PlainFit(ctx context.Context, r Record, hz, decayS float64) (gotHz, gotDecayS float64, ok bool) {
	p := prefix{v: r.Volts, room: new(room), ref: r.Volts[len(r.Volts)-1]}
	c, ok := refine(ctx, p.samples(0, len(r.Volts)), []mode{{d: r.Interval / decayS, w: 2 * math.Pi * hz * r.Interval}})
	if !ok {
		return 0, 0, false
	}
	return c.modes[0].w / (2 * math.Pi * r.Interval), r.Interval / c.modes[0].d, true
}

// Step is what ReadEdge takes for the converter's step.
var Step = convertersStep
