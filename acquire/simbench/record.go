package simbench

import (
	"context"
	"math"
	"sort"
)

// record is the node voltage as integrated, without noise, at every instant of its span. It is not
// changed once made.
type record struct {
	pieces []piece
	end    float64 // s
	peak   Response
	charge float64 // C that node and network have taken up by the end
}

// piece is the node voltage over one step: what step.at gives for v alone.
type piece struct {
	t, h       float64
	v, rise    float64
	d0, d1, d2 float64
}

func (p *piece) at(theta float64) float64 {
	rest := 1 - theta
	return p.v + theta*(p.rise+rest*(p.d0+theta*(p.d1+rest*p.d2)))
}

// Response is the exact answer of the board to one turn-off, noise and sampling apart.
type Response struct {
	Peak    float64 // V: the highest voltage across the switch
	PeakAt  float64 // s after the switch lets go
	Settled float64 // V: where the node stands at the end
}

// solve integrates the circuit to end and keeps the node voltage.
func (c *circuit) solve(ctx context.Context, end, tolerance float64) (*record, error) {
	r := &record{end: end}
	last := c.start()
	err := c.integrate(ctx, end, tolerance, func(s *step) {
		r.pieces = append(r.pieces, piece{t: s.t, h: s.h, v: s.from[1], rise: s.to[1] - s.from[1],
			d0: s.dense[0][1], d1: s.dense[1][1], d2: s.dense[2][1]})
		if s.to[1] > r.peak.Peak {
			r.peak.Peak, r.peak.PeakAt = s.to[1], s.t+s.h
		}
		if s.first[1] > 0 && s.last[1] <= 0 {
			if t, v := c.top(s, tolerance); v > r.peak.Peak {
				r.peak.Peak, r.peak.PeakAt = v, t
			}
		}
		last = s.to
	})
	if err != nil {
		return nil, err
	}
	r.peak.Settled = last[1]
	r.charge = c.stored(last)
	return r, nil
}

// stored is the charge on node and network, C.
func (c *circuit) stored(y state) float64 {
	return c.board.ChargeAt(max(y[1], 0)) + c.fixed*y[1] + c.branchC*y[2]
}

// top finds the maximum of v inside a step that holds one: where the slope vanishes, by bisection, each
// trial a step of its own from the step's start, so that no error of the dense output enters.
func (c *circuit) top(s *step, tolerance float64) (t, v float64) {
	low, high := 0.0, 1.0
	v, t = s.to[1], s.t+s.h
	for range 60 {
		mid := (low + high) / 2
		trial, _ := c.take(s.t, s.from, s.first, s.mode, mid*s.h, tolerance, c.scale())
		if trial.last[1] > 0 {
			low = mid
		} else {
			high = mid
		}
		v, t = trial.to[1], trial.t+trial.h
	}
	return t, v
}

// sample writes the node voltage at start, start+dt, ... into out; it is 0 before t = 0 and stays at the
// last value after the end.
func (r *record) sample(start, dt float64, out []float64) {
	i := 0
	for n := range out {
		t := start + float64(n)*dt
		switch {
		case t <= 0:
			out[n] = 0
			continue
		case t >= r.end:
			out[n] = r.peak.Settled
			continue
		}
		if p := &r.pieces[i]; t > p.t+p.h {
			i += sort.Search(len(r.pieces)-1-i, func(k int) bool { return t <= r.pieces[i+k].t+r.pieces[i+k].h })
		}
		p := &r.pieces[i]
		out[n] = p.at(math.Min(1, (t-p.t)/p.h))
	}
}
