package waveform

import (
	"context"
	"math"
	"math/cmplx"
)

// curve is a level and modes fitted to samples: v(t) = level + sum of Re(amp e^((-d + i w) t)), t in samples from the
// first of those fitted, v and the level less the series' ref.
type curve struct {
	modes []mode
	level float64
	amp   []complex128
	rss   float64 // V^2
	n     int
	sol   *solved
}

// at is the curve's value t samples after its start.
func (c *curve) at(t float64) float64 {
	v := c.level
	for k, m := range c.modes {
		s, co := math.Sincos(m.w * t)
		v += math.Exp(-m.d*t) * (real(c.amp[k])*co - imag(c.amp[k])*s)
	}
	return v
}

// parameters is how many numbers were fitted.
func (c *curve) parameters() int { return c.sol.columns }

// held fits level and amplitudes with the modes as they are.
func held(in series, modes []mode) (*curve, bool) {
	sol, ok := gather(in, modes).solve()
	if !ok {
		return nil, false
	}
	x := sol.coefficients(sol.values)
	c := &curve{modes: append([]mode(nil), modes...), level: x[0], rss: sol.rss(), n: len(in.y), sol: sol}
	at := 1
	for _, m := range modes {
		if m.w == 0 {
			c.amp = append(c.amp, complex(x[at], 0))
		} else {
			c.amp = append(c.amp, complex(x[at], -x[at+1]))
		}
		at += m.columns()
	}
	return c, true
}

// refine fits everything by least squares, from modes that are near. It is the Gauss-Newton method with the level and the
// amplitudes eliminated (Golub and Pereyra, "The differentiation of pseudo-inverses and nonlinear least squares problems
// whose variables separate", SIAM J. Numer. Anal. 10, 413 (1973), in Kaufman's simplification, BIT 15, 49 (1975); both from
// memory). For exponentials it takes a simple form: fit
//
//	level + sum of p e^(s t) + q t e^(s t)
//
// linearly, and s moves by q/p. A step that does not lower the residual is halved.
func refine(ctx context.Context, in series, start []mode) (*curve, bool) {
	at, ok := held(in, start)
	if !ok {
		return nil, false
	}
	share := 1.0
	step := at.step()
	for range 40 {
		if ctx.Err() != nil {
			return nil, false
		}
		next := make([]mode, len(at.modes))
		small := true
		for k, m := range at.modes {
			move := step[k]
			size := cmplx.Abs(complex(m.d, m.w))
			if a := cmplx.Abs(move); a > 0.3*size {
				move *= complex(0.3*size/a, 0)
			}
			if cmplx.Abs(move) > 1e-12*size && cmplx.Abs(move)*cmplx.Abs(at.amp[k]) > 1e-4*at.bound(k) {
				small = false
			}
			move *= complex(share, 0)
			next[k] = mode{m.d - real(move), m.w + imag(move)}
			if m.w != 0 && !(next[k].w > 0 && next[k].w < math.Pi) || !plausible(next[k], len(in.y)) {
				return nil, false
			}
		}
		if small {
			return at, true
		}
		c, ok := held(in, next)
		if !ok || !(c.rss <= at.rss*(1+1e-12)+1e-15*at.sol.yy) {
			if share /= 2; share < 1e-3 {
				return at, true
			}
			continue
		}
		settled := share == 1 && at.rss-c.rss < 1e-6*c.rss/float64(len(in.y)) // a step that a tiny part of a standard uncertainty gained
		at, share = c, min(1, share*2)
		step = at.step()
		if settled {
			return at, true
		}
	}
	return at, true
}

// plausible keeps the exponentials representable over the n samples.
func plausible(m mode, n int) bool { return m.d*float64(n) > -30 && m.d < 30 }

// step is the Gauss-Newton step of each mode's -d + i w.
func (c *curve) step() []complex128 {
	x := c.sol.coefficients(c.sol.columns)
	out := make([]complex128, len(c.modes))
	at := c.sol.values
	for k, m := range c.modes {
		q := complex(x[at], 0)
		if m.w != 0 {
			q = complex(x[at], -x[at+1])
		}
		if c.amp[k] != 0 {
			out[k] = q / c.amp[k]
		}
		at += m.columns()
	}
	return out
}

// bound is the standard uncertainty of mode k's q, were nothing else unknown: the scale on which its step matters.
func (c *curve) bound(k int) float64 {
	at := c.sol.values
	for _, m := range c.modes[:k] {
		at += m.columns()
	}
	return math.Sqrt(c.rss/float64(max(1, c.n-c.sol.columns))) * c.sol.scale[at]
}
