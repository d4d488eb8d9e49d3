package waveform

import "gonum.org/v1/gonum/floats"

// sums are the normal equations of samples on the columns: first the values (1, then e^(-d t) cos w t and e^(-d t) sin w t of
// each mode), then the same of each mode times t, which is what a change of d or w does.
type sums struct {
	columns, values, n int
	gram               [maxColumns][maxColumns]float64 // lower triangle
	with               [maxColumns]float64
	yy                 float64
}

// gather goes once through the samples, the first at t = 0. Where the modes have died away, only the level's
// sums are left to take.
//
// Over a stretch from t on, the sum of y e^(s t') is e^(s t) times that of y e^(s j), j from 0: six sums over a table and the
// samples. The columns' products among themselves are sums of powers, the same in every stretch but for a factor.
func gather(in series, modes []mode) *sums {
	in.room.lay(modes)
	alive := gone(modes, len(in.y))
	var p products
	p.lay(modes, min(stretch, alive))
	var with [maxModes][2]complex128 // of y with e^(s t) and t e^(s t)
	var sum, squares float64
	for t := 0; t < alive; t += stretch {
		n := min(stretch, alive-t)
		if n < p.n {
			p.lay(modes, n)
		}
		y := in.room.y[:n]
		for i, v := range in.y[t : t+n] {
			v -= in.ref
			y[i] = v
			sum += v
		}
		squares += floats.Dot(y, y)
		for k, m := range modes {
			tb, turn := &in.room.table[k], m.power(float64(t))
			a, b := complex(floats.Dot(y, tb.re[:n]), 0), complex(floats.Dot(y, tb.jre[:n]), 0)
			if m.w != 0 {
				a += complex(0, floats.Dot(y, tb.im[:n]))
				b += complex(0, floats.Dot(y, tb.jim[:n]))
			}
			with[k][0] += turn * a
			with[k][1] += turn * (complex(float64(t), 0)*a + b)
		}
		p.add(modes, float64(t))
	}
	for _, v := range in.y[alive:] {
		v -= in.ref
		sum += v
		squares += v * v
	}
	s := &sums{n: len(in.y), yy: squares}
	s.set(modes, &p, &with, sum)
	return s
}

// set puts the sums where the columns stand.
func (s *sums) set(modes []mode, p *products, with *[maxModes][2]complex128, sum float64) {
	s.values = 1
	for _, m := range modes {
		s.values += m.columns()
	}
	s.columns = 2*s.values - 1
	s.with[0], s.gram[0][0] = sum, float64(s.n)
	at := 1
	for k, m := range modes {
		for power, i := range [2]int{at, at + s.values - 1} {
			s.with[i] = real(with[k][power])
			s.gram[i][0] = real(p.one[k][power])
			if m.w != 0 {
				s.with[i+1] = imag(with[k][power])
				s.gram[i+1][0] = imag(p.one[k][power])
			}
		}
		from := 1
		for l := range k + 1 {
			other := modes[l]
			for a, i := range [2]int{at, at + s.values - 1} {
				for b, j := range [2]int{from, from + s.values - 1} {
					// the products of real and imaginary parts, from z w and z* w
					both, against := p.both[k][l][a+b], p.against[k][l][a+b]
					s.put(i, j, real(both+against)/2)
					if other.w != 0 {
						s.put(i, j+1, imag(both+against)/2)
					}
					if m.w != 0 {
						s.put(i+1, j, imag(both-against)/2)
					}
					if m.w != 0 && other.w != 0 {
						s.put(i+1, j+1, real(against-both)/2)
					}
				}
			}
			from += other.columns()
		}
		at += m.columns()
	}
}

// put keeps the lower triangle.
func (s *sums) put(i, j int, v float64) { s.gram[max(i, j)][min(i, j)] = v }
