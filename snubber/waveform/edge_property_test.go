package waveform_test

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"pgregory.net/rapid"

	"ringbook/snubber/waveform"
)

// Whatever the samples, ReadEdge ends without a panic and gives no figure that is not finite or whose interval is upside down.
func TestAnyRecord(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 800).Draw(t, "n")
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
		scale := math.Pow(10, rapid.Float64Range(-12, 12).Draw(t, "decade"))
		offset := scale * rapid.SampledFrom([]float64{0, 1, -3, 1e4}).Draw(t, "offset")
		noise := rapid.SampledFrom([]float64{0, 0, 1e-6, 0.01, 0.3}).Draw(t, "noise")
		step := rapid.SampledFrom([]float64{0, 0, 0.01, 0.2, 1}).Draw(t, "step")
		parts := rapid.IntRange(0, 4).Draw(t, "parts")
		v := make([]float64, n)
		for range parts {
			at, size := rng.IntN(n), rng.NormFloat64()
			w, d, phi := math.Pi*math.Pow(rng.Float64(), 2), rng.ExpFloat64()*math.Pow(10, -3*rng.Float64()), 6*rng.Float64()
			kind := rng.IntN(5)
			for i := at; i < n; i++ {
				x := float64(i - at)
				switch kind {
				case 0:
					v[i] += size
				case 1:
					v[i] += size * math.Exp(-d*x) * math.Cos(w*x+phi)
				case 2:
					v[i] += size * math.Cos(w*x+phi)
				case 3:
					v[i] = max(min(v[i], size), -size)
				case 4:
					v[i] += size * x / float64(n)
				}
			}
		}
		for i := range v {
			v[i] += noise * rng.NormFloat64()
			if step > 0 {
				v[i] = step * math.Round(v[i]/step)
			}
			v[i] = offset + scale*v[i]
		}
		r := waveform.Record{Start: rng.NormFloat64(), Interval: math.Pow(10, -12+12*rng.Float64()), Volts: v, StepV: step * scale}
		if rng.IntN(2) == 0 {
			r.StepV = 0
		}
		e, err := waveform.ReadEdge(context.Background(), r, waveform.Options{})
		if err != nil {
			t.Fatal(err)
		}
		sane(t, r, e)
	})
}

// sane is what holds of any edge.
func sane(t *rapid.T, r waveform.Record, e waveform.Edge) {
	figures := map[string]*waveform.Figure{"ring_hz": e.RingHz, "decay_s": e.DecayS, "damping_ratio": e.DampingRatio, "peak_v": e.PeakV, "settled_v": e.SettledV}
	if e.Second != nil {
		figures["second"], figures["second's decay"] = &e.Second.Hz, &e.Second.DecayS
	}
	for name, f := range figures {
		if f == nil {
			continue
		}
		for _, x := range []float64{f.Value, f.U, f.Low, f.High} {
			if math.IsNaN(x) || math.IsInf(x, 0) {
				t.Fatalf("%s %v is not finite", name, *f)
			}
		}
		if !(f.U >= 0) || f.Low > f.Value || f.Value > f.High {
			t.Fatalf("%s %v: upside down", name, *f)
		}
	}
	for _, x := range []float64{e.EdgeS, e.SNRdB, e.PeakFitV, e.PeakSampleV, e.NoiseV, e.FitFrom, e.FitTo, e.AmplitudeV} {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			t.Fatalf("not finite: %+v", e)
		}
	}
	if e.Ringing != (e.RingHz != nil) || !e.Ringing && (e.DecayS != nil || e.DampingRatio != nil || e.Second != nil) {
		t.Fatalf("ringing %v, but ring_hz %v, decay_s %v", e.Ringing, e.RingHz, e.DecayS)
	}
	if e.Warnings == nil || e.PeakV == nil || e.SettledV == nil {
		t.Fatalf("no warnings, no peak or no level: %+v", e)
	}
	half := r.Interval / 2
	if e.EdgeS < r.Start-half || e.EdgeS > r.TimeAt(len(r.Volts)-1)+half {
		t.Fatalf("the edge at %g s is outside the record", e.EdgeS)
	}
	if e.Ringing {
		if e.RingHz.Value > 0.5/r.Interval {
			t.Fatalf("%g Hz of samples %g s apart", e.RingHz.Value, r.Interval)
		}
		if v, ok := e.Fitted((e.FitFrom + e.FitTo) / 2); !ok || math.IsNaN(v) {
			t.Fatalf("the fitted curve has no value in its middle")
		}
	}
}
