package waveform

import (
	"context"
	"math"
	"math/cmplx"
)

// reader turns what was found into the figures of an Edge.
type reader struct {
	Record
	p     prefix
	step  float64
	edges []onset
	at    onset
	ring  *ring
	e     *Edge

	cov    [maxColumns][maxColumns]float64 // V^2: of the fit's coefficients
	dof    int
	white  bool    // what the fit leaves looks like white noise
	drift  float64 // Hz: the ring's frequency in the later half of the fit less in the first; 0: none seen
	driftD float64 // 1/sample: d likewise, where the frequency drifts

	before    int     // samples before the edge; 0: none
	low, high float64 // V: levels before the edge and after
}

// figures of a ring that was found.
func (r *reader) figures(ctx context.Context) {
	c := r.ring.curve
	r.e.curve, r.e.reference = c, r.p.ref
	r.e.FitFrom, r.e.FitTo = r.TimeAt(r.ring.start), r.TimeAt(r.ring.end-1)
	r.uncertain()
	main := c.modes[0]
	r.e.AmplitudeV = r.ring.amplitude()
	r.e.SNRdB = 20*math.Log10(r.e.AmplitudeV/r.e.NoiseV) - 10*math.Log10(2)
	r.e.SettledV = figure(c.level+r.p.ref, math.Sqrt(r.cov[0][0]), r.dof)
	r.drifts(ctx)
	u := r.modeU(0)
	u.d = math.Hypot(u.d, r.driftD/math.Sqrt(3)) // a rectangle to either side: what it tends to may be as far off again
	hz := main.w / (2 * math.Pi * r.Interval)
	r.e.Ringing = true
	r.e.RingHz = figure(hz, math.Hypot(u.w/(2*math.Pi*r.Interval), r.drift/math.Sqrt(3)), r.dof)
	r.e.DecayS = decay(main.d, u.d, r.Interval, r.dof)
	if r.e.DecayS != nil {
		r.e.DampingRatio = damping(main, u, r.dof)
	}
	if r.e.RingHz == nil || main.d < -coverage(r.dof)*u.d { // what grows is no ring
		r.e.Ringing, r.e.RingHz, r.e.DecayS, r.e.DampingRatio = false, nil, nil, nil
		r.e.SNRdB, r.e.AmplitudeV, r.e.FitFrom, r.e.FitTo = 0, 0, 0, 0
		r.e.curve, r.ring = nil, nil
		r.levels()
		return
	}
	if hasSecond(c) && !c.harmonic() {
		v := r.modeU(1)
		f := figure(c.modes[1].w/(2*math.Pi*r.Interval), v.w/(2*math.Pi*r.Interval), r.dof)
		tau := decay(c.modes[1].d, v.d, r.Interval, r.dof)
		if f != nil && tau != nil {
			r.e.Second = &Tone{Hz: *f, DecayS: *tau, AmplitudeV: cmplx.Abs(c.amp[1])}
		}
	}
}
