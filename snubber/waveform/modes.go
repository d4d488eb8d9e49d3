package waveform

import "math"

// mode is one part of what a linear circuit does by itself: e^(-d t) cos(w t + phi), or e^(-d t) where w is 0. Both are per
// sample, so that the fit knows neither hertz nor seconds.
type mode struct{ d, w float64 }

func (m mode) columns() int {
	if m.w == 0 {
		return 1
	}
	return 2
}

// period is the samples a cycle takes.
func (m mode) period() float64 { return 2 * math.Pi / m.w }

const (
	maxModes   = 4               // two tones and two plain exponentials
	maxColumns = 1 + 2*(2+2+1+1) // the level, and each mode's values and what they change by
	stretch    = 128             // samples that one table of powers serves
	goneAt     = 14              // e-foldings after which a mode is taken for nothing (under a millionth of it is left)
)

// series is samples to fit, less ref each, and the room to work in.
type series struct {
	y    []float64
	ref  float64
	room *room
}

// room holds the tables of one pass and a stretch of samples: a fit of any length needs no more.
type room struct {
	table [maxModes]table
	y     [stretch]float64
}

// table is z^j and j z^j, z = e^(-d + i w), for the samples j of a stretch. At a stretch that begins at t, all are to be
// turned and shrunk by z^t alone; so no sample costs a sine.
type table struct{ re, im, jre, jim [stretch]float64 }

func (r *room) lay(modes []mode) {
	for k, m := range modes {
		tb := &r.table[k]
		z := m.power(1)
		p := complex(1, 0)
		for j := range stretch {
			if j%16 == 0 { // afresh, before rounding gathers
				p = m.power(float64(j))
			}
			x := float64(j)
			tb.re[j], tb.im[j] = real(p), imag(p)
			tb.jre[j], tb.jim[j] = x*real(p), x*imag(p)
			p *= z
		}
	}
}

// power is e^((-d + i w) t).
func (m mode) power(t float64) complex128 {
	e := math.Exp(-m.d * t)
	if m.w == 0 {
		return complex(e, 0)
	}
	s, c := math.Sincos(m.w * t)
	return complex(e*c, e*s)
}

// row is the columns at one instant t.
func row(modes []mode, t float64) (x [maxColumns]float64, columns int) {
	values := 1
	for _, m := range modes {
		values += m.columns()
	}
	x[0] = 1
	at := 1
	for _, m := range modes {
		e := math.Exp(-m.d * t)
		s, c := math.Sincos(m.w * t)
		x[at], x[at+values-1] = e*c, t*e*c
		if m.w != 0 {
			x[at+1], x[at+values] = e*s, t*e*s
		}
		at += m.columns()
	}
	return x, 2*values - 1
}

// gone is the sample from which on every mode has died away; n where one has not by then.
func gone(modes []mode, n int) int {
	last := 0.0
	for _, m := range modes {
		if m.d <= 0 {
			return n
		}
		last = max(last, goneAt/m.d)
	}
	return int(min(float64(n), math.Ceil(last)))
}
