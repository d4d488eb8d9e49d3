package waveform_test

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"ringbook/snubber/waveform"
)

// The fit begins where the ring does, to a small part of a cycle: after a jump not a sample before it; after an edge without a
// corner where flat and ring come apart.
func TestFitBeginsAtTheRing(t *testing.T) {
	for _, c := range []struct {
		name        string
		m           made
		early, late float64 // cycles
	}{
		{"jump", made{hz: 10e6, q: 10, to: 48, amp: 20, perCycle: 200, n: 9000, before: 500, noise: 0.2}, 0, 0.006},
		{"rest", made{hz: 10e6, q: 10, to: 48, rest: true, perCycle: 200, n: 9000, before: 500, noise: 0.2}, 0.005, 0.05},
	} {
		mean := 0.0
		for seed := range uint64(20) {
			r, edge := c.m.record(rand.New(rand.NewPCG(seed, 4)))
			mean += (readEdge(t, r).FitFrom - edge) * c.m.hz / 20
		}
		if mean < -c.early || mean > c.late {
			t.Errorf("%s: the fit begins %.4f cycles after the edge", c.name, mean)
		}
	}
}

// A ring alone, from its first sample on, is one edge.
func TestRingAloneIsOneEdge(t *testing.T) {
	for seed := range uint64(60) {
		rng := rand.New(rand.NewPCG(seed, 5))
		r, _ := made{hz: 10e6, q: 3 + 30*rng.Float64(), amp: 1, phi: 7 * rng.Float64(), perCycle: 20 + 40*rng.Float64(), n: 3000, noise: 0.01}.record(rng)
		if e := readEdge(t, r); strings.Contains(strings.Join(e.Warnings, ""), "edges") || e.FitFrom > 2*r.Interval {
			t.Errorf("seed %d: fitted from sample %g, %q", seed, e.FitFrom/r.Interval, e.Warnings)
		}
	}
}

// Next to no noise before a converter of 6 and 8 bits: what it rounds off is no white noise, and after the ring all samples
// are one code. The intervals must still hold the truth.
func TestConverterWithoutNoise(t *testing.T) {
	n, f, d := 0, 0, 0
	for seed := range uint64(200) {
		rng := rand.New(rand.NewPCG(seed, 6))
		m := made{hz: 10e6, q: 4 + 12*rng.Float64(), to: 48, rest: true, perCycle: 30 + 40*rng.Float64(), n: 5000, before: 400, noise: 0.001, bits: 6 + 2*int(seed%2)}
		r, _ := m.record(rng)
		e := readEdge(t, r)
		if e.DecayS == nil {
			t.Errorf("seed %d: %q", seed, e.Warnings)
			continue
		}
		_, rate := m.rate()
		n++
		if e.RingHz.Low < m.hz && m.hz < e.RingHz.High {
			f++
		}
		if e.DecayS.Low < 1/rate && 1/rate < e.DecayS.High {
			d++
		}
	}
	t.Logf("%d frequencies and %d decays of %d held", f, d, n)
	if f < n*90/100 || d < n*90/100 {
		t.Errorf("intervals hold %d frequencies and %d decays of %d", f, d, n)
	}
}

// A frequency that rises as the ring dies: the interval reaches to what it tends to.
func TestMovingFrequency(t *testing.T) {
	m := good
	_, d := m.rate()
	rng := rand.New(rand.NewPCG(1, 7))
	v := make([]float64, m.n)
	per := d / (m.hz * m.perCycle)
	for i := range v {
		if x := float64(i-m.before) - 0.3; x > 0 {
			v[i] = 48 - 40*math.Exp(-per*x)*math.Cos(2*math.Pi/m.perCycle*(x-0.01/per*(1-math.Exp(-per*x))))
		}
		v[i] += 0.1 * rng.NormFloat64()
	}
	e := readEdge(t, waveform.Record{Interval: 1 / (m.hz * m.perCycle), Volts: v})
	if e.RingHz == nil || e.RingHz.Low > m.hz || e.RingHz.High < m.hz || e.RingHz.U > 0.01*m.hz {
		t.Errorf("ring_hz %v, tends to %g", e.RingHz, m.hz)
	}
}
