package simbench

import (
	"math"
	"math/rand/v2"
	"testing"
)

// drawn makes a capture of v(t), t = 0 being the trigger, with the default scope.
func drawn(seed uint64, noise float64, v func(t float64) float64) Capture {
	s := Default().Scope
	rng := rand.New(rand.NewPCG(seed, 0))
	c := Capture{StartS: -float64(s.Before) / s.RateHz, StepS: 1 / s.RateHz, VoltsPerBit: s.SpanV / 255, BottomV: s.BottomV,
		Codes: make([]uint8, s.Points)}
	late := rng.Float64() * c.StepS
	for i := range c.Codes {
		x := 0.0
		if t := c.TimeAt(i) + late; t > 0 {
			x = v(t)
		}
		c.Codes[i] = uint8(math.Round((x + noise*rng.NormFloat64() - c.BottomV) / c.VoltsPerBit))
	}
	return c
}

// TestEvaluate checks the scope's figures on edges whose ring is known by construction: right on the
// average of many, and scattered as a good bench scope's are.
func TestEvaluate(t *testing.T) {
	for _, c := range []struct{ hz, decay, amp, level, hzScatter, decayScatter float64 }{
		{88e6, 38e-9, 48, 48, 0.001, 0.01},
		{60e6, 60e-9, 30, 48, 0.001, 0.01},
		{110e6, 30e-9, 45, 48, 0.001, 0.01},
		{30e6, 37e-9, 45, 48, 0.004, 0.03},
		{75e6, 40e-9, 8, 12, 0.005, 0.06},
	} {
		const n = 300
		var hz, decay, hz2, decay2, peak, level float64
		for seed := range uint64(n) {
			f := drawn(seed, 0.3, func(t float64) float64 {
				return c.level - c.amp*math.Exp(-t/c.decay)*math.Cos(2*math.Pi*c.hz*t)
			}).Evaluate()
			hz += f.RingHz / n
			hz2 += f.RingHz * f.RingHz / n
			decay += f.DecayS / n
			decay2 += f.DecayS * f.DecayS / n
			peak += f.PeakV / n
			level += f.SettledV / n
		}
		d := 1 / c.decay
		w := 2 * math.Pi * c.hz
		at := (math.Pi - math.Atan(d/w)) / w // where the slope of exp(-d t) cos(w t) vanishes
		wantPeak := c.level - c.amp*math.Exp(-d*at)*math.Cos(w*at)
		spread := func(m2, m float64) float64 { return math.Sqrt(max(m2-m*m, 0)) / m }
		t.Logf("%+v: %.5g Hz +-%.2f %%, %.4g s +-%.2f %%, peak %.3f V of %.3f", c, hz, 100*spread(hz2, hz), decay, 100*spread(decay2, decay), peak, wantPeak)
		if math.Abs(hz/c.hz-1) > 0.002 || spread(hz2, hz) > c.hzScatter {
			t.Errorf("%g Hz: mean %g, scatter %.2g of it", c.hz, hz, spread(hz2, hz))
		}
		if math.Abs(decay/c.decay-1) > 0.02 || spread(decay2, decay) > c.decayScatter {
			t.Errorf("%g s: mean %g, scatter %.2g of it", c.decay, decay, spread(decay2, decay))
		}
		if math.Abs(peak-wantPeak) > 0.005*wantPeak {
			t.Errorf("peak %g V, want %g", peak, wantPeak)
		}
		if math.Abs(level-c.level) > 0.1 {
			t.Errorf("level %g V, want %g", level, c.level)
		}
	}
}

// TestGlitch: a disturbance after the ring has died away is no part of it.
func TestGlitch(t *testing.T) {
	for seed := range uint64(50) {
		f := drawn(seed, 0.3, func(t float64) float64 {
			v := 48 - 48*math.Exp(-t/20e-9)*math.Cos(2*math.Pi*80e6*t)
			if t > 170e-9 && t < 200e-9 {
				v += 8 * math.Sin(2*math.Pi*30e6*t)
			}
			return v
		}).Evaluate()
		if math.Abs(f.RingHz/80e6-1) > 0.01 || math.Abs(f.DecayS/20e-9-1) > 0.1 {
			t.Errorf("seed %d: %+v", seed, f)
		}
	}
}

// TestNoRing: noise alone, a flat line, a step and an edge that overshoots once give no ring, however the
// noise falls; the peak and the level stand all the same.
func TestNoRing(t *testing.T) {
	for name, v := range map[string]func(float64) float64{
		"nothing":   func(float64) float64 { return 0 },
		"step":      func(float64) float64 { return 48 },
		"slow edge": func(t float64) float64 { return 48 * (1 - math.Exp(-t/20e-9)) },
		"one overshoot": func(t float64) float64 {
			return 48 - 48*math.Exp(-t/4e-9)*math.Cos(2*math.Pi*60e6*t)
		},
		"ramp": func(t float64) float64 { return 200e6 * t },
	} {
		for _, noise := range []float64{0, 0.3, 2} {
			for seed := range uint64(100) {
				f := drawn(seed, noise, v).Evaluate()
				if !math.IsNaN(f.RingHz) || !math.IsNaN(f.DecayS) {
					t.Errorf("%s, noise %g V, seed %d: ring of %g Hz, decay %g s", name, noise, seed, f.RingHz, f.DecayS)
					break
				}
				if math.IsNaN(f.PeakV) || math.IsInf(f.PeakV, 0) || math.IsNaN(f.SettledV) {
					t.Errorf("%s: peak %g V, level %g V", name, f.PeakV, f.SettledV)
				}
			}
		}
	}
}

// FuzzEvaluate: any record gives figures or NaN.
func FuzzEvaluate(f *testing.F) {
	f.Add([]byte("a record"))
	f.Fuzz(func(t *testing.T, codes []byte) {
		full := make([]uint8, 64+len(codes))
		copy(full[16:], codes)
		c := Capture{StepS: 1e-9, VoltsPerBit: 1, BottomV: -1, Codes: full}
		if g := c.Evaluate(); g.RingHz <= 0 || g.DecayS <= 0 || math.IsInf(g.RingHz, 0) || math.IsNaN(g.SettledV) {
			t.Errorf("%v: %+v", codes, g)
		}
	})
}
