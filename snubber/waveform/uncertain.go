package waveform

import "math"

// uncertain finds the noise and with it the covariance of the fit's coefficients.
func (r *reader) uncertain() {
	c := r.ring.curve
	v := r.p.samples(r.ring.start, r.ring.end)
	left := c.residual(v)
	r.dof = max(1, len(v.y)-c.parameters())
	variance := left.squares / float64(r.dof)
	variance = max(variance, r.p.tiny*r.p.tiny)
	r.e.NoiseV = math.Sqrt(variance)
	r.white = true
	// White noise gives means over quarter cycles the same variance, times their length. The ring's own part of the record
	// counts: the first three e-foldings.
	alive := len(left.runs)
	if d := c.modes[0].d; d > 0 {
		alive = min(alive, max(8, int(3/d/(c.modes[0].period()/4))))
	}
	if alive >= 8 {
		squares := 0.0
		for _, m := range left.runs[:alive] {
			squares += m * m
		}
		mean := squares / float64(alive)
		if mean > variance*(1+4*math.Sqrt(2/float64(alive))) {
			r.white = false
			variance = mean
		}
	}
	r.cov = c.sol.inverse()
	for i := range r.cov {
		for j := range r.cov {
			r.cov[i][j] *= variance
		}
	}
}

// modeUncertain is the standard uncertainties of a mode's d and w, per sample, and their covariance.
type modeUncertain struct{ d, w, dw float64 }

// modeU takes mode k's part of the covariance: a change of its q changes -d + i w by q/p (see refine).
func (r *reader) modeU(k int) modeUncertain {
	c := r.ring.curve
	at := c.sol.values
	for _, m := range c.modes[:k] {
		at += m.columns()
	}
	vaa, vbb, vab := r.cov[at][at], r.cov[at+1][at+1], r.cov[at][at+1]
	// q = a - i b, 1/p = g + i h: real part a g + b h, imaginary a h - b g
	inv := 1 / c.amp[k]
	g, h := real(inv), imag(inv)
	re := g*g*vaa + 2*g*h*vab + h*h*vbb
	im := h*h*vaa - 2*g*h*vab + g*g*vbb
	both := g*h*vaa + (h*h-g*g)*vab - g*h*vbb
	return modeUncertain{d: math.Sqrt(max(re, 0)), w: math.Sqrt(max(im, 0)), dw: -both}
}

// decay is 1/d in seconds; nil where d is not clearly positive. The interval is d's turned over.
func decay(d, u, interval float64, dof int) *Figure {
	k := coverage(dof)
	if !(d-k*u > 0) {
		return nil
	}
	f := &Figure{Value: interval / d, U: interval * u / (d * d), Low: interval / (d + k*u), High: interval / (d - k*u)}
	if !f.finite() {
		return nil
	}
	return f
}

// damping is d/sqrt(w^2 + d^2), uncertain by u; its interval stays above 0.
func damping(m mode, u modeUncertain, dof int) *Figure {
	n := math.Hypot(m.w, m.d)
	byD, byW := m.w*m.w/(n*n*n), -m.w*m.d/(n*n*n)
	v := byD*byD*u.d*u.d + byW*byW*u.w*u.w + 2*byD*byW*u.dw
	f := figure(m.d/n, math.Sqrt(max(v, 0)), dof)
	if f != nil {
		f.Low = max(f.Low, 0)
	}
	return f
}

// valueU is the standard uncertainty of the curve t samples after its start, V.
func (r *reader) valueU(t float64) float64 {
	x, n := row(r.ring.curve.modes, t)
	v := 0.0
	for i := range n {
		for j := range n {
			v += x[i] * x[j] * r.cov[i][j]
		}
	}
	return math.Sqrt(max(v, 0))
}
