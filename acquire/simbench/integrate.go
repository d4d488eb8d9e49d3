package simbench

import (
	"context"
	"errors"
	"fmt"
	"math"
)

// The coefficients of Dormand and Prince (1980), as printed in Hairer, Norsett and Wanner, Solving
// Ordinary Differential Equations I, 2nd ed. 1993, table II.5.2; the dense output is theirs, II.6
// [both from memory; integrate_test.go proves the order of each].
var (
	stageTime   = [7]float64{0, 1. / 5, 3. / 10, 4. / 5, 8. / 9, 1, 1}
	stageWeight = [7][6]float64{
		{},
		{1. / 5},
		{3. / 40, 9. / 40},
		{44. / 45, -56. / 15, 32. / 9},
		{19372. / 6561, -25360. / 2187, 64448. / 6561, -212. / 729},
		{9017. / 3168, -355. / 33, 46732. / 5247, 49. / 176, -5103. / 18656},
		{35. / 384, 0, 500. / 1113, 125. / 192, -2187. / 6784, 11. / 84},
	}
	errorWeight = [7]float64{71. / 57600, 0, -71. / 16695, 71. / 1920, -17253. / 339200, 22. / 525, -1. / 40}
	denseWeight = [7]float64{-12715105075. / 11282082432, 0, 87487479700. / 32700410799, -10690763975. / 1880347072,
		701980252875. / 199316789632, -1453857185. / 822651844, 69997945. / 29380423}
)

// step is one accepted step of the integration, with the polynomial between its ends.
type step struct {
	t, h     float64 // s: it covers t to t+h
	from, to state
	first    state // slope at t
	last     state // slope at t+h
	dense    [3]state
	mode     mode
}

// at is the state at t + theta h, theta in [0, 1]; order 4 in h.
func (s *step) at(theta float64) (y state) {
	rest := 1 - theta
	for k := range y {
		y[k] = s.from[k] + theta*((s.to[k]-s.from[k])+rest*(s.dense[0][k]+theta*(s.dense[1][k]+rest*s.dense[2][k])))
	}
	return y
}

// take makes one step of h from (t, y), whose slope is k1, and says how far the two orders are apart, in
// units of the tolerance: at most 1 is good.
func (c *circuit) take(t float64, y, k1 state, m mode, h, tolerance float64, scale state) (s step, size float64) {
	var k [7]state
	k[0] = k1
	next := y
	for i := 1; i < 7; i++ {
		next = y
		for j := range i {
			w := h * stageWeight[i][j]
			for n := range next {
				next[n] += w * k[j][n]
			}
		}
		k[i] = c.slope(t+stageTime[i]*h, next, m)
	}
	s = step{t: t, h: h, from: y, to: next, first: k1, last: k[6], mode: m}
	for n := range y {
		var wrong, curve float64
		for i := range k {
			wrong += errorWeight[i] * k[i][n]
			curve += denseWeight[i] * k[i][n]
		}
		rise := next[n] - y[n]
		s.dense[0][n] = h*k1[n] - rise
		s.dense[1][n] = rise - h*k[6][n] - s.dense[0][n]
		s.dense[2][n] = h * curve
		e := h * wrong / (tolerance * (scale[n] + max(math.Abs(y[n]), math.Abs(next[n]))))
		size += e * e
	}
	return s, math.Sqrt(size / float64(len(y)))
}

// mostSteps bounds an integration: the stiffest network on the default board needs a tenth of it.
const mostSteps = 4_000_000

// integrate follows the circuit from the switch's letting go to t = end and hands over every step, which each may not keep. tolerance
// is the relative error allowed in one step. A step never reaches across the end of the current's fall,
// nor across an instant at which a diode switches: there it ends.
func (c *circuit) integrate(ctx context.Context, end, tolerance float64, each func(*step)) error {
	var (
		t     float64
		y     = c.start()
		m     = c.modeAt(y)
		scale = c.scale()
		h     = end / 1e4
		k1    = c.slope(t, y, m)
		s     step // one for all steps
		size  float64
	)
	for n := 0; t < end; n++ {
		if n >= mostSteps {
			return fmt.Errorf("integrate the board: %d steps reached only %g s of %g s; take a shorter record or a larger resistance", n, t, end)
		}
		if n%1024 == 0 && ctx.Err() != nil {
			return ctx.Err()
		}
		stop := end
		if t < c.board.FallTime {
			stop = min(end, c.board.FallTime)
		}
		lands := t+h >= stop
		if lands {
			h = stop - t
		}
		s, size = c.take(t, y, k1, m, h, tolerance, scale)
		if math.IsNaN(size) {
			return errors.New("integrate the board: the voltages are not finite")
		}
		grow := min(5, max(0.2, 0.9*math.Pow(max(size, 1e-10), -0.2)))
		if size > 1 {
			h *= min(grow, 0.9)
			if t+h == t {
				return fmt.Errorf("integrate the board: the step vanished at %g s", t)
			}
			continue
		}
		if theta, after, ok := c.switching(&s); ok {
			// The partial step is taken anew: it is more exact than the dense output.
			s, _ = c.take(t, y, k1, m, theta*h, tolerance, scale)
			each(&s)
			t, y, m = s.t+s.h, s.to, after
			k1 = c.slope(t, y, m)
			continue
		}
		each(&s)
		t, y = s.t+s.h, s.to
		k1 = s.last
		if lands {
			t = stop
			k1 = c.slope(t, y, m)
		}
		h *= grow
	}
	return nil
}

func (c *circuit) modeAt(y state) mode {
	body, network := c.margins(y)
	return mode{body: body > 0, network: network > 0}
}

// switching finds the first instant within a step at which a diode starts or stops conducting, as a
// fraction of the step, and the mode that follows.
func (c *circuit) switching(s *step) (theta float64, after mode, ok bool) {
	wrong := func(y state) bool { return c.modeAt(y) != s.mode }
	if !wrong(s.to) {
		return 0, s.mode, false
	}
	// Bisection down to the last bits: it ends on the far side of the threshold, so that the new mode's
	// own steps do not fall back across it.
	low, high := 0.0, 1.0
	for range 60 {
		if mid := (low + high) / 2; wrong(s.at(mid)) {
			high = mid
		} else {
			low = mid
		}
	}
	return high, c.modeAt(s.at(high)), true
}
