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
		{"rest", made{hz: 10e6, q: 10, to: 48, rest: true, perCycle: 200, n: 9000, before: 500, noise: 0.2}, 0.01, 0.01},
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

// Little noise before a converter of 4 to 8 bits: what it rounds off is no white noise, and after the ring all samples are one
// code, or one of two that the level lies between. The intervals must still hold the truth, that of the level with them, and no
// second tone may be seen in codes.
func TestConverterWithoutNoise(t *testing.T) {
	for _, c := range []struct {
		name    string
		noise   float64 // steps
		between bool    // the level lies between two codes
	}{{"none", 0.002, false}, {"a seventh of a step", 0.15, false}, {"between two codes", 0.15, true}} {
		n, f, d, level, second := 0, 0, 0, 0, 0
		for seed := range uint64(200) {
			rng := rand.New(rand.NewPCG(seed, 6))
			m := made{hz: 10e6, q: 4 + 12*rng.Float64(), to: 48, rest: true, perCycle: 30 + 40*rng.Float64(), n: 5000, before: 400, bits: 4 + 2*int(seed%3)}
			step := m.step()
			m.noise, m.bits = c.noise*step, 0
			r, _ := m.record(rng)
			zero := m.to + step*rng.Float64()
			if c.between {
				zero = m.to + 0.5*step
			}
			for i, v := range r.Volts {
				r.Volts[i] = zero + step*math.Round((v-zero)/step)
			}
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
			if e.SettledV.Low < m.to && m.to < e.SettledV.High {
				level++
			}
			if e.Second != nil {
				second++
			}
		}
		t.Logf("%s: %d frequencies, %d decays and %d levels of %d held, %d second tones", c.name, f, d, level, n, second)
		if f < n*90/100 || d < n*90/100 || level < n*90/100 || second > 0 {
			t.Errorf("%s: intervals hold %d frequencies, %d decays and %d levels of %d; %d second tones", c.name, f, d, level, n, second)
		}
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

// A heavily damped ring tells most at its start, which noise hides where it leaves the flat without a corner: the fit's start keeps to
// where the curve touches the flat, with a standard deviation of a thirtieth of a cycle.
func TestFitBeginsWhereTheCurveTouches(t *testing.T) {
	m := made{hz: 10e6, q: 3, to: 1, rest: true, perCycle: 40, n: 900, before: 200, noise: 0.022}
	squares := 0.0
	for seed := range uint64(100) {
		r, edge := m.record(rand.New(rand.NewPCG(seed, 4)))
		off := (readEdge(t, r).FitFrom - edge) * m.hz
		squares += off * off / 100
	}
	if math.Sqrt(squares) > 0.034 {
		t.Errorf("the fit begins %.4f cycles off, root mean square", math.Sqrt(squares))
	}
}
