package waveform_test

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"ringbook/snubber/waveform"
)

// good is a record with nothing to warn of.
var good = made{hz: 30e6, q: 10, to: 48, rest: true, perCycle: 40, n: 3000, before: 300, noise: 0.2}

func warnings(t *testing.T, r waveform.Record) string {
	t.Helper()
	return strings.Join(readEdge(t, r).Warnings, "\n")
}

func TestGoodRecordsDoNotWarn(t *testing.T) {
	warned := 0
	for seed := range uint64(100) {
		for _, bits := range []int{0, 8} {
			m := good
			m.bits = bits
			r, _ := m.record(rand.New(rand.NewPCG(seed, 1)))
			if w := warnings(t, r); w != "" {
				warned++
				t.Log(w)
			}
		}
	}
	if warned > 4 {
		t.Errorf("%d of 200 good records warn", warned)
	}
}

// Each warning on a record that deserves it; none of them on the good one.
func TestWarnings(t *testing.T) {
	for _, c := range []struct {
		name, want string
		change     func(m *made)
		spoil      func(m made, v []float64)
	}{
		{name: "few samples", want: "samples a cycle", change: func(m *made) { m.perCycle = 6 }},
		{name: "short", want: "cycles: record longer", change: func(m *made) { m.n = m.before + 90 }},
		{name: "not gone", want: "% of its first amplitude", change: func(m *made) { m.n = m.before + 200 }},
		{name: "not gone, 8 bits", want: "% of its first amplitude", change: func(m *made) { m.n, m.bits = m.before+200, 8 }},
		{name: "no decay", want: "does not measurably decay", change: func(m *made) { m.q, m.n, m.rest, m.amp = 1e6, 1000, false, 48 }},
		{name: "coarse", want: "quantisation dominates", change: func(m *made) { m.bits, m.noise = 5, 0.01 }},
		{name: "jump", want: "the edge is over within", change: func(m *made) { m.rest, m.amp, m.phi = false, 10, 0.5 }},
		{name: "second", want: "a second tone at 105.0 MHz", change: func(m *made) { m.second = []made{{hz: 105e6, q: 15, amp: 8}} }},
		{name: "clipped", want: "clipped: ", spoil: func(m made, v []float64) {
			for i := range v {
				v[i] = min(v[i], 75)
			}
		}},
		{name: "clipped below", want: "clipped: ", spoil: func(m made, v []float64) {
			for i := range v {
				v[i] = max(v[i], 20)
			}
		}},
		{name: "moving", want: "the frequency rises by", spoil: func(m made, v []float64) {
			_, d := m.rate()
			d /= m.hz * m.perCycle
			for i := range v {
				if x := float64(i - m.before); x > 0 {
					v[i] = 48 - 40*math.Exp(-d*x)*math.Cos(2*math.Pi/m.perCycle*(x-0.01/d*(1-math.Exp(-d*x))))
				}
			}
		}},
		{name: "a glitch", want: "the peak is", spoil: func(m made, v []float64) { v[m.before+220] += 45 }},
		{name: "constant", want: "nothing moves", spoil: func(m made, v []float64) {
			for i := range v {
				v[i] = 5
			}
		}},
		{name: "step", want: "no ring stands out", spoil: func(m made, v []float64) {
			for i := range v {
				v[i] = math.Floor(float64(i)/1000) + 0.01*math.Sin(float64(i*i))
			}
		}},
	} {
		m := good
		if c.change != nil {
			c.change(&m)
		}
		r, _ := m.record(rand.New(rand.NewPCG(2, 1)))
		if c.spoil != nil {
			c.spoil(m, r.Volts)
		}
		if got := warnings(t, r); !strings.Contains(got, c.want) {
			t.Errorf("%s: %q does not say %q", c.name, got, c.want)
		}
	}
}

// Clipping hides the tops: the ring is read from what comes after, and still right.
func TestClippedRingIsRead(t *testing.T) {
	m := good
	m.q = 20
	r, _ := m.record(rand.New(rand.NewPCG(2, 1)))
	for i := range r.Volts {
		r.Volts[i] = min(r.Volts[i], 75)
	}
	e := readEdge(t, r)
	_, d := m.rate()
	within(t, "ring_hz", e.RingHz, m.hz, 4, 0.001)
	within(t, "decay_s", e.DecayS, 1/d, 4, 0.01)
}

// Clipped a little or by half of its overshoot: what lies on the end of the range bends the decay, and is left out.
func TestClippedRingsHold(t *testing.T) {
	n, held := 0, 0
	for seed := range uint64(200) {
		rng := rand.New(rand.NewPCG(seed, 41))
		m := made{hz: 30e6, q: 5 + 20*rng.Float64(), to: 48, rest: true, perCycle: 20 + 60*rng.Float64(), n: 3000, before: 300, noise: 0.1, bits: 8 * int(seed%2)}
		r, _ := m.record(rng)
		_, d := m.rate()
		top := 48 + 48*math.Exp(-d*0.5/m.hz)*(0.5+0.49*rng.Float64())
		for i := range r.Volts {
			r.Volts[i] = min(r.Volts[i], top)
		}
		e := readEdge(t, r)
		n++
		if e.DecayS != nil && e.DecayS.Low < 1/d && 1/d < e.DecayS.High {
			held++
		}
	}
	t.Logf("%d of %d decays held", held, n)
	if held < n*88/100 {
		t.Errorf("intervals hold %d of %d decays", held, n)
	}
}

// The converter's step is found from the samples, from printed ones too; where there is none, none is.
func TestConvertersStep(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for _, c := range []struct {
		name  string
		q     float64
		print float64 // rounded to multiples of this
	}{{"8 bits", 0.43, 0}, {"printed", 0.43137, 1e-4}, {"coarse", 2.5, 0}, {"none", 0, 0}} {
		m := good
		r, _ := m.record(rng)
		for i, v := range r.Volts {
			if c.q > 0 {
				v = 0.11 + c.q*math.Round(v/c.q)
			}
			if c.print > 0 {
				v = c.print * math.Round(v/c.print)
			}
			r.Volts[i] = v
		}
		if got := waveform.Step(r.Volts); math.Abs(got-c.q) > 1e-3*c.q {
			t.Errorf("%s: step %g, want %g", c.name, got, c.q)
		}
	}
}
