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
	var part, run float64
	inPart, inRun := 0, 0
	c.walk(in, func(_ int, e []float64) {
		for _, v := range e {
			part += v * v
			run += v
			if inPart++; inPart == size {
				r.parts = append(r.parts, part/float64(size))
				r.squares += part
				part, inPart = 0, 0
			}
			if inRun++; inRun == quarter {
				if len(r.runs) < 4096 {
					r.runs = append(r.runs, run/math.Sqrt(float64(quarter)))
				}
				run, inRun = 0, 0
			}
		}
	})
	if inPart > 0 {
		r.parts = append(r.parts, part/float64(inPart))
		r.squares += part
	}
	return r
}

// walk gives the residuals in stretches, y less the curve.
func (c *curve) walk(in series, use func(t int, e []float64)) {
	in.room.lay(c.modes)
	alive := gone(c.modes, len(in.y))
	for t := 0; t < len(in.y); t += stretch {
		n := min(stretch, len(in.y)-t)
		e := in.room.y[:n]
		for i, v := range in.y[t : t+n] {
			e[i] = v - in.ref - c.level
		}
		if t < alive {
			for k, m := range c.modes {
				a := c.amp[k] * m.power(float64(t))
				floats.AddScaled(e, -real(a), in.room.table[k].re[:n])
				if m.w != 0 {
					floats.AddScaled(e, imag(a), in.room.table[k].im[:n])
				}
			}
		}
		use(t, e)
	}
}

// quiet is the noise's standard deviation from the parts of the record in which the curve fits best: the median part's, so
// that a start that is not of the curve does not raise it.
func (r residuals) quiet() float64 {
	p := append([]float64(nil), r.parts...)
	sort.Float64s(p)
	n := float64(max(1, r.n/len(p))) // squares of n samples: their median lies below their mean (Wilson and Hilferty, from memory)
	return math.Sqrt(p[len(p)/2] / math.Pow(1-2/(9*n), 3))
}
