package waveform

import (
	"math"

	"gonum.org/v1/gonum/floats"
)

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
	maxColumns = 13  // 1 and twice the columns of two tones and two plain exponentials
	stretch    = 128 // samples from one exact sine, cosine and exponential to the next
	goneAt     = 14  // e-foldings after which a mode is taken for nothing (under a millionth of it is left)
)

// basis holds the columns over one stretch of samples: first the values (1, then e^(-d t) cos w t and e^(-d t) sin w t of
// each mode), then the same of each mode times t, which is what a change of d or w does.
type basis struct {
	columns, values int
	col             [maxColumns][]float64
	y               []float64
}

// series is samples to fit, less ref each, and the room to work in.
type series struct {
	y    []float64
	ref  float64
	room *room
}

// room is one stretch of columns, and of samples, laid out anew by every pass: a fit of any length needs no more.
type room [(maxColumns + 1) * stretch]float64

// lay sets the columns out for the modes.
func (b *basis) lay(modes []mode, store *room) {
	b.values = 1
	for _, m := range modes {
		b.values += m.columns()
	}
	b.columns = 2*b.values - 1
	for i := range b.columns {
		b.col[i] = store[i*stretch : (i+1)*stretch]
	}
	b.y = store[b.columns*stretch : (b.columns+1)*stretch]
	for i := range b.col[0] {
		b.col[0][i] = 1
	}
}

// fill writes the columns for n samples from t on. Within the stretch each mode is turned and shrunk from sample to
// sample by one multiplication; the rounding of 128 of them is some 1e-14.
func (b *basis) fill(modes []mode, t, n int) {
	at := 1
	for _, m := range modes {
		k := m.columns()
		e, r := math.Exp(-m.d*float64(t)), math.Exp(-m.d)
		if k == 1 {
			v, tv := b.col[at][:n], b.col[at+b.values-1][:n]
			for i := range v {
				v[i], tv[i] = e, float64(t+i)*e
				e *= r
			}
		} else {
			s, c := math.Sincos(m.w * float64(t))
			ds, dc := math.Sincos(m.w)
			s, c, ds, dc = s*e, c*e, ds*r, dc*r
			vc, vs := b.col[at][:n], b.col[at+1][:n]
			tc, ts := b.col[at+b.values-1][:n], b.col[at+b.values][:n]
			x := float64(t)
			for i := range vc {
				vc[i], vs[i], tc[i], ts[i] = c, s, x*c, x*s
				c, s = c*dc-s*ds, s*dc+c*ds
				x++
			}
		}
		at += k
	}
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

// sums are the normal equations of samples on the basis.
type sums struct {
	columns, values, n int
	gram               [maxColumns][maxColumns]float64 // lower triangle
	with               [maxColumns]float64
	yy                 float64
}

// gather goes once through the samples, the first at t = 0. Where the modes have died away, only the level's
// sums are left to take. Memory is one stretch, whatever the record's length.
func gather(in series, modes []mode) *sums {
	y, ref := in.y, in.ref
	var b basis
	b.lay(modes, in.room)
	s := &sums{columns: b.columns, values: b.values, n: len(y)}
	alive := gone(modes, len(y))
	for t := 0; t < alive; t += stretch {
		n := min(stretch, alive-t)
		b.fill(modes, t, n)
		part := b.y[:n]
		for i, v := range y[t : t+n] {
			part[i] = v - ref
		}
		s.yy += floats.Dot(part, part)
		for i := range b.columns {
			ci := b.col[i][:n]
			s.with[i] += floats.Dot(ci, part)
			for j := range i + 1 {
				s.gram[i][j] += floats.Dot(ci, b.col[j][:n])
			}
		}
	}
	var sum, squares float64
	for _, v := range y[alive:] {
		v -= ref
		sum += v
		squares += v * v
	}
	s.with[0] += sum
	s.yy += squares
	s.gram[0][0] += float64(len(y) - alive)
	return s
}
