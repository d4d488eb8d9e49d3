package waveform_test

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"ringbook/snubber/waveform"
)

// made describes a record made up for a test: flat, then at an instant between two samples an edge, and a ring from there.
type made struct {
	hz, q    float64 // the ring's damped frequency and its Q (d = w/(2 Q), as for the damped frequency here)
	amp, phi float64 // V, rad: at the edge
	from, to float64 // V: levels
	perCycle float64 // samples
	before   int     // samples of flat before the edge
	n        int
	noise    float64 // V
	bits     int     // 0: not quantised; the range is that of the record, with a tenth to spare
	second   []made  // more tones, from the same edge: hz, q, amp, phi
	rest     bool    // the step response of an LC from rest: amp and phi from the levels, value and slope 0 at the edge
}

func (m made) rate() (w, d float64) {
	w = 2 * math.Pi * m.hz
	return w, w / (2 * m.q)
}

// record makes it; edge is the edge's instant, a part of a sample after sample before.
func (m made) record(rng *rand.Rand) (r waveform.Record, edge float64) {
	dt := 1 / (m.hz * m.perCycle)
	if m.rest {
		w, d := m.rate()
		m.amp, m.phi = (m.from-m.to)*math.Hypot(1, d/w), -math.Atan2(d, w)
		if m.from > m.to {
			m.phi = -math.Atan2(d, w)
		}
	}
	part := rng.Float64()
	if m.before == 0 {
		part = 0
	}
	r = waveform.Record{Start: -float64(m.before) * dt, Interval: dt, Volts: make([]float64, m.n)}
	edge = part * dt
	if m.before == 0 {
		edge = 0
	}
	for i := range r.Volts {
		t := r.TimeAt(i) - edge
		v := m.from
		if t >= -1e-9*dt {
			v = m.to
			for _, x := range append([]made{m}, m.second...) {
				w, d := x.rate()
				v += x.amp * math.Exp(-d*t) * math.Cos(w*t+x.phi)
			}
		}
		r.Volts[i] = v + m.noise*rng.NormFloat64()
	}
	if m.bits > 0 {
		q := m.step()
		zero := q * rng.Float64()
		for i, v := range r.Volts {
			r.Volts[i] = zero + q*math.Round((v-zero)/q)
		}
	}
	return r, edge
}

// step is the converter's, V, whose range is that of the ring with a tenth to spare; 0: no converter.
func (m made) step() float64 {
	if m.bits == 0 {
		return 0
	}
	size := math.Abs(m.amp)
	if m.rest {
		size = math.Abs(m.to - m.from)
	}
	return 1.1 * (2*size + max(0, math.Abs(m.to-m.from)-size)) / math.Exp2(float64(m.bits))
}

// bound is the Cramer-Rao bound of f (Hz) and d (1/s) in white noise of sd sigma: amplitude, phase, frequency, decay and,
// where said, level unknown, from the ring's first sample: the inverse of J'J/sigma^2.
func (m made) bound(sigma float64, level bool) (f, d float64) {
	w, dd := m.rate()
	dt := 1 / (m.hz * m.perCycle)
	n := m.n - m.before
	var g [5][5]float64
	for i := range n {
		t := float64(i) * dt
		e := m.amp * math.Exp(-dd*t)
		s, c := math.Sincos(w*t + m.phi)
		j := [5]float64{e * c, -e * s, -t * e * s, -t * e * c, m.amp}
		j[2] *= w
		j[3] *= w
		for a := range 5 {
			for b := range 5 {
				g[a][b] += j[a] * j[b]
			}
		}
	}
	if !level {
		for a := range 4 {
			g[a][4], g[4][a] = 0, 0
		}
	}
	inv := invert5(g)
	return sigma * math.Sqrt(inv[2][2]) * w / (2 * math.Pi), sigma * math.Sqrt(inv[3][3]) * w
}

// invert5 by Gauss and Jordan with pivoting.
func invert5(a [5][5]float64) (inv [5][5]float64) {
	for i := range 5 {
		inv[i][i] = 1
	}
	for c := range 5 {
		p := c
		for r := c; r < 5; r++ {
			if math.Abs(a[r][c]) > math.Abs(a[p][c]) {
				p = r
			}
		}
		a[c], a[p], inv[c], inv[p] = a[p], a[c], inv[p], inv[c]
		v := a[c][c]
		for k := range 5 {
			a[c][k] /= v
			inv[c][k] /= v
		}
		for r := range 5 {
			if r == c {
				continue
			}
			f := a[r][c]
			for k := range 5 {
				a[r][k] -= f * a[c][k]
				inv[r][k] -= f * inv[c][k]
			}
		}
	}
	return inv
}

func readEdge(t testing.TB, r waveform.Record) waveform.Edge {
	t.Helper()
	e, err := waveform.ReadEdge(context.Background(), r, waveform.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return e
}

func near(t testing.TB, what string, got, want, within float64) {
	t.Helper()
	if !(math.Abs(got-want) <= within*math.Abs(want)) {
		t.Errorf("%s = %.9g, want %.9g within %g", what, got, want, within)
	}
}
