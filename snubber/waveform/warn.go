package waveform

import (
	"fmt"
	"math"

	"ringbook/snubber/quantity"
)

func (r *reader) say(format string, args ...any) {
	r.e.Warnings = append(r.e.Warnings, fmt.Sprintf(format, args...))
}

func hertz(f float64) string   { return quantity.Format(f, quantity.Frequency, 4) }
func seconds(t float64) string { return quantity.Format(t, quantity.Time, 4) }
func volts(v float64) string   { return quantity.Format(v, quantity.Voltage, 4) }

// warn says what spoils the figures, and the cure.
func (r *reader) warn() {
	if !r.e.Ringing {
		r.warnQuiet()
		return
	}
	if len(r.edges) > 1 {
		r.say("%d edges in the record: this is the one at %s, with the strongest ring; record one edge alone to read another", len(r.edges), seconds(r.e.EdgeS))
	}
	r.warnSampling()
	r.warnLength()
	r.warnConverter()
	r.warnCurve()
	r.warnPeak()
}

// warnQuiet is for a record in which nothing rings.
func (r *reader) warnQuiet() {
	switch {
	case len(r.Volts) < minSamples:
		r.say("only %d samples: a ring is looked for in %d or more; record longer", len(r.Volts), minSamples)
	case r.e.spread == 0:
		r.say("all samples are %s: nothing moves; check the probe, the trigger and the vertical range", volts(r.Volts[0]))
	default:
		r.say("no ring stands out of the noise (false alarms: less than 1 in 1000): if there should be one, record it larger, at more samples a cycle, or averaged")
	}
}

// warnSampling: under 10 samples a cycle the edge's own shape hides in one or two samples and a faster tone may be folded
// over; and an edge over within two samples is faster than the record shows. Both bounds are common practice.
func (r *reader) warnSampling() {
	if n := r.perCycle(); n < 10 {
		r.say("only %.1f samples a cycle: the peak may lie between samples and a faster tone may pose as this one; sample at %s a second or more", n, quantity.Format(20*r.e.RingHz.Value, quantity.Ratio, 2))
	}
	if r.before == 0 || r.high == r.low {
		return
	}
	a, okA := r.crossing(0.1)
	b, okB := r.crossing(0.9)
	if okA && okB && b-a < 2 {
		r.say("the edge is over within %.1f samples: it may be faster than the record shows, and the ring's first top higher; sample faster, with a bandwidth of 0.35 over the rise time or more", b-a)
	}
}

// warnLength: a decay read from less than three cycles, or from a ring that has not died down to a tenth, leans on the model.
func (r *reader) warnLength() {
	main := r.ring.curve.modes[0]
	if r.e.DecayS == nil {
		r.say("the ring does not measurably decay within the record: its decay is not given; record longer")
		return
	}
	n := float64(r.ring.end - r.ring.start)
	if cycles := n / main.period(); cycles < 3 {
		r.say("the ring's fit has only %.1f cycles: record longer after the edge", cycles)
	}
	if left := math.Exp(-main.d * n); left > max(0.1, r.step/r.e.AmplitudeV) { // under a step, what is left tells nothing
		r.say("the ring is still at %.0f %% of its first amplitude where the record or the next edge ends it: record longer after the edge", 100*left)
	}
}

// warnConverter: coarse steps and a clipped top or bottom.
func (r *reader) warnConverter() {
	if r.step > 0 && r.e.NoiseV < 1.5*r.step/math.Sqrt(12) && r.e.AmplitudeV < 64*r.step {
		r.say("quantisation dominates: the ring is %.0f steps of %s high; choose a finer vertical range, or average several records", 2*r.e.AmplitudeV/r.step, volts(r.step))
	}
	if c := r.ring.clipped(r.p, r.at.at, r.step); c.longest > 0 {
		r.say("clipped: %d samples in a row lie on one end of the range, flatter than a ring's turn: the peak is higher than read, and the fit leaves them out; choose a larger vertical range", c.longest)
	}
}

// warnCurve: what the model does not say.
func (r *reader) warnCurve() {
	if t := r.e.Second; t != nil {
		r.say("a second tone at %s, %.0f %% of the ring's amplitude, dying in %s: often the probe's own ground lead; shorten it, or compare with the lead held differently",
			hertz(t.Hz.Value), 100*t.AmplitudeV/r.e.AmplitudeV, seconds(t.DecayS.Value))
	}
	if r.ring.curve.harmonic() {
		r.say("the ring has an overtone at twice its frequency, and so is not of one sine: the node's capacitance changes with voltage; the figures are of the later, smaller swings")
	}
	if r.drift != 0 {
		way := "rises"
		if r.drift < 0 {
			way = "falls"
		}
		r.say("the frequency %s by %s as the ring dies: the node's capacitance changes with voltage, or two tones lie close; the figure is a mean, and its uncertainty holds that", way, hertz(math.Abs(r.drift)))
	}
	if r.ring.misfit || !r.white {
		r.say("the samples do not follow one damped tone to within their noise: the uncertainties are widened; look at the curve over the samples")
	}
}

// warnPeak: the top by the fit and by the samples.
func (r *reader) warnPeak() {
	between := r.e.AmplitudeV * (1 - math.Cos(math.Pi/r.perCycle())) // a top may fall between samples
	d := r.e.PeakFitV - r.e.PeakSampleV
	if allowed := 5*r.e.NoiseV + r.step + 0.005*r.e.AmplitudeV; d > allowed+between || -d > allowed {
		r.say("the peak is %s by the fitted curve and %s by the highest sample: look at the record near its top", volts(r.e.PeakFitV), volts(r.e.PeakSampleV))
	}
}
