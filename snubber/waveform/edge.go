package waveform

import (
	"context"
	"fmt"
	"math"
)

// Edge is what a record shows of one edge and of the ring after it.
type Edge struct {
	Ringing      bool    `json:"ringing"`       // a ring stands out of the noise
	RingHz       *Figure `json:"ring_hz"`       // Hz: the damped frequency, as seen; nil where nothing rings
	DecayS       *Figure `json:"decay_s"`       // s: 1/e time of the ring's envelope; nil too where it does not decay in the record
	DampingRatio *Figure `json:"damping_ratio"` // d/sqrt(w^2 + d^2), d = 1/DecayS, w = 2 pi RingHz; nil like DecayS
	PeakV        *Figure `json:"peak_v"`        // V: the highest voltage of the record, without its noise
	SettledV     *Figure `json:"settled_v"`     // V: the level the ring dies down to
	EdgeS        float64 `json:"edge_s"`        // s, in the record's time: half way between the levels, or where the ring begins
	SNRdB        float64 `json:"snr_db"`        // dB: amplitude^2/2 where the fit begins over NoiseV^2; 0 where nothing rings

	PeakFitV    float64 `json:"peak_fit_v"`    // V: by a curve through the samples near the top
	PeakSampleV float64 `json:"peak_sample_v"` // V: the highest sample
	Rising      bool    `json:"rising"`
	NoiseV      float64 `json:"noise_v"`  // V: standard deviation of what the fit leaves; quantisation with it
	FitFrom     float64 `json:"fit_from"` // s, in the record's time: the samples that the ring's fit used
	FitTo       float64 `json:"fit_to"`
	AmplitudeV  float64 `json:"amplitude_v"` // V: of the ring at FitFrom
	Second      *Tone   `json:"second"`      // a second ring beside the first, weaker; nil where none stands out

	Warnings []string `json:"warnings"` // each says what spoils the figures, and the cure; never nil

	curve     *curve
	reference float64 // V: what the curve's level is counted from
	interval  float64
	spread    float64 // V: highest sample less lowest
}

// Tone is a second damped oscillation in the record.
type Tone struct {
	Hz         Figure  `json:"hz"`          // Hz: damped frequency
	DecayS     Figure  `json:"decay_s"`     // s: 1/e time
	AmplitudeV float64 `json:"amplitude_v"` // V: where the fit begins
}

// Fitted is the fitted curve at an instant of the record's time, s; ok is false outside what was fitted.
func (e Edge) Fitted(t float64) (v float64, ok bool) {
	if e.curve == nil || t < e.FitFrom || t > e.FitTo {
		return 0, false
	}
	return e.reference + e.curve.at((t-e.FitFrom)/e.interval), true
}

// Options are the estimator's. The zero value is the default.
type Options struct {
	// MaxEdges bounds how many edges of a record are tried for the strongest ring; 0: 4.
	MaxEdges int
}

// minSamples is the shortest record in which a ring is looked for.
const minSamples = 16

// ReadEdge reads the edge of a record whose ring is the strongest, and fits
//
//	v(t) = level + A e^(-d t) cos(w t + phi)
//
// to the samples after it, with a second such tone and a plain exponential where the samples show them: by the matrix pencil
// for the start (see pencil), then by least squares (see refine). The fit begins where the samples join that curve: from a
// safe instant after the edge it is grown back as long as they lie on it. It ends before the next edge.
//
// Standard uncertainties are those of least squares with the noise taken from what the fit leaves, quantisation with it, widened
// where the rest is not white. A ring is reported only where it stands out of the noise without
// its first half cycle, beside plain exponentials; a record of noise, with or without an edge, passes that test less than once in
// a thousand.
//
// Errors: a record that does not pass Check, and the context's. What spoils the figures but not all of them is in
// Warnings. Time is linear in the record's length; memory besides the record is some twice the record's.
func ReadEdge(ctx context.Context, r Record, opt Options) (Edge, error) {
	if err := r.Check(); err != nil {
		return Edge{}, fmt.Errorf("read the edge: %w", err)
	}
	if opt.MaxEdges < 0 {
		return Edge{}, fmt.Errorf("read the edge: at most %d edges to try: it must be positive, or 0 for 4", opt.MaxEdges)
	}
	p := newPrefix(r.Volts)
	if span := p.spread(); math.IsInf(span, 0) || span > 1e150 {
		return Edge{}, fmt.Errorf("read the edge: the samples spread over %g V: no voltage does; check the scale", span)
	}
	if opt.MaxEdges == 0 {
		opt.MaxEdges = 4
	}
	step := r.StepV
	if step == 0 {
		step = convertersStep(r.Volts)
	}
	all := p.onsets(opt.MaxEdges)
	e := Edge{Warnings: []string{}, interval: r.Interval}
	var found *ring
	at := onset{at: 0, scale: 1}
	if len(r.Volts) >= minSamples {
		var err error
		if found, at, all, err = p.strongestRing(ctx, all, step); err != nil {
			return Edge{}, fmt.Errorf("read the edge: %w", err)
		}
	}
	read := reader{Record: r, p: p, step: step, edges: all, at: at, ring: found, e: &e}
	read.levels()
	if found != nil {
		read.figures(ctx)
	}
	read.peak()
	read.warn()
	return e, nil
}

// strongestRing reads the ring after each edge, to the next one, and takes the strongest. Where nothing rings, at is the
// largest edge. edges are those left: one that a later fit grew back over was none, but a swing of that ring.
func (p prefix) strongestRing(ctx context.Context, all []onset, step float64) (found *ring, at onset, edges []onset, err error) {
	for i := 0; i < len(all); i++ {
		got, last := p.ringAfter(ctx, all, i, step)
		if ctx.Err() != nil {
			return nil, at, nil, ctx.Err()
		}
		first := all[i]
		i = last
		if got != nil {
			period := got.curve.modes[0].period()
			if float64(got.start-first.at) > 2*period { // the ring is of a later, smaller edge
				edges = append(edges, first)
				first = onset{at: got.start, scale: max(1, int(period/8)), size: got.amplitude()}
			}
			for k := len(edges) - 1; k >= 0 && edges[k].at+max(edges[k].scale, int(2*period)) > got.start; k-- {
				if found != nil && at == edges[k] {
					found = nil
				}
				first, edges = edges[k], edges[:k]
			}
			if found == nil || got.amplitude() > found.amplitude() {
				found, at = got, first
			}
		}
		edges = append(edges, first)
	}
	if found == nil {
		for _, o := range edges {
			if o.size > at.size {
				at = o
			}
		}
	}
	return found, at, edges, nil
}

// ringAfter reads the ring after edge i, and says over which of the later onsets its fit goes: the last of them, or i. What
// a fit goes over was no edge, but the ring's own beat or noise.
func (p prefix) ringAfter(ctx context.Context, all []onset, i int, step float64) (got *ring, last int) {
	last = i
	to := 0
	for j := i; j < len(all); j++ {
		until := len(p.sum) - 1
		if j+1 < len(all) {
			until = max(all[j+1].at-2*all[j+1].scale, all[i].at)
		}
		on := p.findRing(ctx, all[i], 0, until, step)
		if j > i && (on == nil || on.misfit || on.start >= all[j].at || !on.asGoodAs(got)) {
			break
		}
		got, last, to = on, j, until
	}
	if got == nil {
		return nil, i
	}
	if c := got.clipped(p, all[i].at, step); c.end > got.start {
		if after := p.findRing(ctx, onset{at: c.end, scale: 1, size: all[i].size}, c.end, to, step); after != nil {
			got = after
		}
	}
	return got, last
}
