package waveform_test

import (
	"context"
	"encoding/json"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"ringbook/snubber/waveform"
)

// within says by how many standard uncertainties a figure is off, and fails beyond most or where the figure says nothing.
func within(t *testing.T, what string, f *waveform.Figure, want, most, share float64) {
	t.Helper()
	switch {
	case f == nil:
		t.Errorf("%s: none, want %g", what, want)
	case math.Abs(f.Value-want) > most*f.U:
		t.Errorf("%s = %g, want %g: %.1f standard uncertainties off", what, f.Value, want, math.Abs(f.Value-want)/f.U)
	case f.U > share*math.Abs(want):
		t.Errorf("%s = %g with a standard uncertainty of %g", what, f.Value, f.U)
	}
}

// Frequencies of 1 kHz to 500 MHz, amplitudes of 10 mV to 1 kV, rising and falling, below zero too: the figures scale.
func TestScales(t *testing.T) {
	for _, hz := range []float64{1e3, 1e6, 500e6} {
		for _, amp := range []float64{0.01, 1, 1e3} {
			for _, m := range []made{
				{from: 0, to: amp, rest: true},
				{from: amp, to: -0.4 * amp, rest: true},
				{from: -amp, to: -3 * amp, amp: 0.3 * amp, phi: 1},
				{from: 0, to: 0, amp: amp, phi: 0.5},
			} {
				m.hz, m.q, m.perCycle, m.n, m.before, m.noise = hz, 8, 40, 3000, 400, 0.01*amp
				r, edge := m.record(rand.New(rand.NewPCG(3, 3)))
				e := readEdge(t, r)
				_, d := m.rate()
				within(t, "ring_hz", e.RingHz, hz, 4, 0.002)
				within(t, "decay_s", e.DecayS, 1/d, 4, 0.02)
				within(t, "damping_ratio", e.DampingRatio, d/math.Hypot(d, 2*math.Pi*hz), 4, 0.02)
				if e.SettledV == nil || math.Abs(e.SettledV.Value-m.to) > 0.01*amp {
					t.Errorf("settled_v %v, want %g", e.SettledV, m.to)
				}
				if m.to != m.from && e.Rising != (m.to > m.from) {
					t.Errorf("from %g to %g V: rising %v", m.from, m.to, e.Rising)
				}
				if off := math.Abs(e.EdgeS-edge) * hz; off > 0.25 {
					t.Errorf("the edge is %.3f cycles off", off)
				}
			}
		}
	}
}

// The highest voltage and the level, and their intervals: of a step response the peak is known in closed form,
// to + (to - from) e^(-d pi/w). An edge half way up is at the instant where the curve is.
func TestPeakLevelAndEdge(t *testing.T) {
	for _, bits := range []int{0, 8} {
		rng := rand.New(rand.NewPCG(6, uint64(bits)))
		const n = 300
		peak, level := 0, 0
		for range n {
			m := made{hz: 30e6, q: 4 + 20*rng.Float64(), to: 48, rest: true, perCycle: 30 + 40*rng.Float64(), n: 3000, before: 300, noise: 0.5, bits: bits}
			r, edge := m.record(rng)
			e := readEdge(t, r)
			w, d := m.rate()
			if want := 48 * (1 + math.Exp(-d*math.Pi/w)); e.PeakV.Low < want && want < e.PeakV.High {
				peak++
			}
			if e.SettledV.Low < 48 && 48 < e.SettledV.High {
				level++
			}
			half := math.Acos(0.5) / w // without damping; with it a little later
			if off := math.Abs(e.EdgeS - edge - half); off > 0.03/m.hz {
				t.Errorf("edge at %g s, want %g", e.EdgeS, edge+half)
			}
		}
		t.Logf("%d bits: %d peaks and %d levels of %d held", bits, peak, level, n)
		if peak < n*91/100 || level < n*91/100 {
			t.Errorf("%d bits: intervals hold %d peaks and %d levels of %d", bits, peak, level, n)
		}
	}
}

// Few samples a cycle, a weak ring, a long flat before the edge: found, and the figures hold.
func TestHardRecords(t *testing.T) {
	for _, c := range []struct {
		name  string
		m     made
		share float64
	}{
		{"5 samples a cycle", made{hz: 200e6, q: 8, to: 12, amp: 6, perCycle: 5.3, n: 1000, before: 100, noise: 0.05}, 0.01},
		{"7 samples a cycle, 8 bits", made{hz: 100e6, q: 15, to: 48, rest: true, perCycle: 7.1, n: 2000, before: 500, noise: 0.2, bits: 8}, 0.01},
		{"3 samples a cycle", made{hz: 100e6, q: 10, to: 48, amp: 20, perCycle: 3.1, n: 1000, before: 200, noise: 0.1}, 0.01},
		{"20 dB, Q 3", made{hz: 10e6, q: 3, to: 10, rest: true, perCycle: 60, n: 3000, before: 300, noise: 0.7}, 0.05},
		{"14 dB, Q 20", made{hz: 10e6, q: 20, to: 10, amp: 1, perCycle: 60, n: 6000, before: 300, noise: 0.14}, 0.02},
		{"weak after a high step", made{hz: 30e6, q: 12, to: 400, amp: 8, phi: 2, perCycle: 50, n: 4000, before: 500, noise: 1, bits: 8}, 0.02},
		{"long flat", made{hz: 50e6, q: 6, to: 48, rest: true, perCycle: 25, n: 60000, before: 58000, noise: 0.3}, 0.02},
		{"simulated scope's way", made{hz: 30e6, q: 12, to: 48, rest: true, perCycle: 60, n: 6000, before: 600, noise: 0.05, bits: 8}, 0.01},
		{"heavily damped", made{hz: 20e6, q: 1.3, to: 48, rest: true, perCycle: 50, n: 3000, before: 300, noise: 0.1}, 0.05},
		{"thousands a cycle", made{hz: 1e6, q: 8, to: 48, rest: true, perCycle: 5000, n: 200000, before: 20000, noise: 1}, 0.01},
	} {
		for seed := range uint64(5) {
			r, _ := c.m.record(rand.New(rand.NewPCG(seed, 12)))
			e := readEdge(t, r)
			_, d := c.m.rate()
			within(t, c.name+": ring_hz", e.RingHz, c.m.hz, 4.5, c.share)
			within(t, c.name+": decay_s", e.DecayS, 1/d, 4.5, 10*c.share)
		}
	}
}

// Three edges in one record: the one with the strongest ring is read, and only to the next edge.
func TestEdgesInOneRecord(t *testing.T) {
	m := made{hz: 20e6, q: 10, to: 10, amp: 3, phi: 1, perCycle: 50, n: 6000, before: 500, noise: 0.02}
	r, _ := m.record(rand.New(rand.NewPCG(1, 1)))
	w, d := 2*math.Pi/44, 2*math.Pi/44/20
	for i := range r.Volts {
		if x := float64(i) - 2500.4; x > 0 {
			r.Volts[i] += -10 + 7*math.Exp(-d*x)*math.Cos(w*x)
		}
		if x := float64(i) - 4500.7; x > 0 {
			r.Volts[i] += 10 + 2*math.Exp(-d*x)*math.Cos(w*x+2)
		}
	}
	e := readEdge(t, r)
	within(t, "ring_hz", e.RingHz, 20e6*50/44, 4, 0.001)
	within(t, "decay_s", e.DecayS, r.Interval/d, 4, 0.01)
	// from 10 V it jumps to 7 V at sample 2500.4, and turns down through 5 V five samples later
	if e.Rising || math.Abs(e.EdgeS-r.TimeAt(2505)) > 2*r.Interval || e.FitTo > r.TimeAt(4500) {
		t.Errorf("rising %v, edge at sample %g, fitted to sample %g", e.Rising, (e.EdgeS-r.Start)/r.Interval, (e.FitTo-r.Start)/r.Interval)
	}
	if !strings.Contains(strings.Join(e.Warnings, "\n"), "edges in the record") {
		t.Errorf("no warning of the other edges in %q", e.Warnings)
	}
}

// A slow exponential under the ring is taken into the fit.
func TestSettlingLevel(t *testing.T) {
	m := made{hz: 20e6, q: 12, to: 10, rest: true, perCycle: 50, n: 5000, before: 500, noise: 0.02}
	r, _ := m.record(rand.New(rand.NewPCG(1, 1)))
	for i := m.before + 1; i < m.n; i++ {
		r.Volts[i] -= 2 * math.Exp(-float64(i-m.before)/900)
	}
	e := readEdge(t, r)
	_, d := m.rate()
	within(t, "ring_hz", e.RingHz, 20e6, 4, 0.001)
	within(t, "decay_s", e.DecayS, 1/d, 4, 0.01)
	within(t, "settled_v", e.SettledV, 10, 4, 0.01)
}

// What a command prints as JSON: figures as value, u, low, high; null where nothing rings; warnings an array.
func TestEdgeJSON(t *testing.T) {
	e := readEdge(t, waveform.Record{Interval: 1, Volts: []float64{1, 1, 1}})
	text, err := json.Marshal(e)
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{`"ringing":false`, `"ring_hz":null`, `"decay_s":null`, `"damping_ratio":null`, `"warnings":["`, `"peak_v":{"value":1,"u":`} {
		if !strings.Contains(string(text), want) {
			t.Errorf("%s is not in %s", want, text)
		}
	}
}

func TestEdgeErrors(t *testing.T) {
	for _, c := range []struct {
		r    waveform.Record
		want string
	}{
		{waveform.Record{Interval: 1}, "read the edge: the record is empty"},
		{waveform.Record{Interval: 1, Volts: []float64{1, math.NaN()}}, "sample 2 of the record"},
		{waveform.Record{Volts: []float64{1, 2}}, "interval of 0 s"},
		{waveform.Record{Interval: 1, Volts: []float64{-1e308, 1e308}}, "check the scale"},
	} {
		if _, err := waveform.ReadEdge(context.Background(), c.r, waveform.Options{}); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v: want %q", err, c.want)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	r, _ := made{hz: 1, q: 10, amp: 1, perCycle: 30, n: 1000}.record(rand.New(rand.NewPCG(1, 1)))
	if _, err := waveform.ReadEdge(ctx, r, waveform.Options{}); err == nil {
		t.Error("a cancelled context gave an answer")
	}
}

// A glitch of one sample, before the edge, in the ring or long after, does not lead astray.
func TestGlitch(t *testing.T) {
	for _, at := range []int{100, 340, 520, 533, 1500} {
		for _, size := range []float64{-40, 20, 45, 75} {
			m := made{hz: 30e6, q: 10, to: 48, rest: true, perCycle: 40, n: 3000, before: 300, noise: 0.2}
			r, _ := m.record(rand.New(rand.NewPCG(7, 7)))
			r.Volts[at] += size
			e := readEdge(t, r)
			if !e.Ringing || e.DecayS == nil {
				t.Errorf("glitch of %g V at sample %d: no ring: %q", size, at, e.Warnings)
				continue
			}
			_, d := m.rate()
			near(t, "ring_hz", e.RingHz.Value, m.hz, 0.004)
			near(t, "decay_s", e.DecayS.Value, 1/d, 0.08)
		}
	}
}
