package waveform_test

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"ringbook/snubber/waveform"
)

// The fitted curve lies on the samples to within their noise, whatever level they ring about.
func TestFittedLiesOnTheSamples(t *testing.T) {
	for _, level := range []float64{-400, 0, 48} {
		m := made{hz: 30e6, q: 10, amp: 10, phi: 0.4, to: level, perCycle: 50, n: 4000, noise: 0.1}
		r, _ := m.record(rand.New(rand.NewPCG(4, 9)))
		e, err := waveform.ReadEdge(context.Background(), r, waveform.Options{})
		if err != nil || !e.Ringing {
			t.Fatalf("%v, %+v", err, e)
		}
		sum, n := 0.0, 0.0
		for i, v := range r.Volts {
			if w, ok := e.Fitted(r.TimeAt(i)); ok {
				sum += (v - w) * (v - w)
				n++
			}
		}
		if rms := math.Sqrt(sum / n); n < 2000 || math.Abs(rms/0.1-1) > 0.05 {
			t.Errorf("at %g V the curve leaves %g V rms on %g samples, the noise is 0.1 V", level, rms, n)
		}
	}
}
