package waveform

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/floats"
)

// residuals is what a curve leaves of the samples, in numbers.
type residuals struct {
	n       int
	squares float64   // V^2, of all
	parts   []float64 // V^2: mean square in each of up to 32 equal parts, in time order
	lag     float64   // correlation of neighbours
	runs    []float64 // V: means over blocks of a quarter of a cycle of the first mode, times the root of their length
}

// residual goes once more through the samples the curve was fitted to.
func (c *curve) residual(in series) residuals {
	y := in.y
	r := residuals{n: len(y)}
	quarter := len(y)
	if len(c.modes) > 0 && c.modes[0].w > 0 {
		quarter = max(1, int(c.modes[0].period()/4))
	}
	parts := min(32, max(1, len(y)/8))
	size := (len(y) + parts - 1) / parts
	var cross, last, part, run float64
	c.walk(in, func(t int, e []float64) {
		for i, v := range e {
			if t+i > 0 {
				cross += v * last
			}
			last = v
			part += v * v
			run += v
			if k := t + i + 1; k%size == 0 || k == len(y) {
				r.parts = append(r.parts, part/float64((k-1)%size+1))
				r.squares += part
				part = 0
			}
			if k := t + i + 1; k%quarter == 0 {
				if len(r.runs) < 4096 {
					r.runs = append(r.runs, run/math.Sqrt(float64(quarter)))
				}
				run = 0
			}
		}
	})
	if r.squares > 0 {
		r.lag = cross / r.squares
	}
	return r
}

// walk gives the residuals in stretches, y less the curve.
func (c *curve) walk(in series, use func(t int, e []float64)) {
	var b basis
	b.lay(c.modes, in.room)
	y := in.y
	e := b.y
	alive := gone(c.modes, len(y))
	for t := 0; t < len(y); t += stretch {
		n := min(stretch, len(y)-t)
		for i, v := range y[t : t+n] {
			e[i] = v - in.ref - c.level
		}
		if t < alive {
			b.fill(c.modes, t, n)
			at := 1
			for k, m := range c.modes {
				floats.AddScaled(e[:n], -real(c.amp[k]), b.col[at][:n])
				if m.w != 0 {
					floats.AddScaled(e[:n], imag(c.amp[k]), b.col[at+1][:n])
				}
				at += m.columns()
			}
		}
		use(t, e[:n])
	}
}

// quiet is the noise's standard deviation from the parts of the record in which the curve fits best: the median part's, so
// that a start that is not of the curve does not raise it.
func (r residuals) quiet() float64 {
	p := append([]float64(nil), r.parts...)
	sort.Float64s(p)
	return math.Sqrt(p[len(p)/2])
}
