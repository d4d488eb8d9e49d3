package snubber

import (
	"context"
	"math"

	"ringbook/snubber/leastsq"
)

// model is what the fit moves: the shared parameters ln T with T = sqrt(L C), ln Z0, ln r where a decay was read, and the
// excitation of each operating point at which a peak was; and beside them the error of each part in units of its standard
// uncertainty. T is what the frequencies tell and Z0 what the capacitors do, so that the two hardly depend on each other,
// where L and C would.
type model struct {
	obs    *observations
	params int
	loss   int            // index of ln r; -1: no decay was read, and r is taken as zero
	amps   []int          // index of each operating point's I0; -1: no peak was read there
	effect [noEffects]int // index of the logarithm of each effect's size; -1: it is left out
	ref    float64        // V: the highest bus, at which the node's capacitance is stated
}

func newModel(obs *observations, effects ...effect) *model {
	m := &model{obs: obs, params: 2, loss: -1, amps: make([]int, len(obs.points))}
	if obs.counts[decayAt] > 0 {
		m.loss = m.params
		m.params++
	}
	for i, p := range obs.points {
		m.amps[i] = -1
		if p.peaks > 0 && !p.still {
			m.amps[i] = m.params
			m.params++
		}
		m.ref = math.Max(m.ref, p.bus)
	}
	for e := range m.effect {
		m.effect[e] = -1
	}
	for _, e := range effects {
		m.effect[e] = m.params
		m.params++
	}
	return m
}

// loop is the loop at parameters p.
func (m *model) loop(p []float64) Loop {
	t, z := math.Exp(p[0]), math.Exp(p[1])
	l := Loop{Inductance: t * z, Capacitance: t / z}
	if m.loss >= 0 {
		l.Resistance = math.Exp(p[m.loss])
	}
	return l
}

// values are what trial x's readings are predicted from, at parameters p and part errors d.
func (m *model) values(x *observed, p, d []float64) circuitValues {
	l := m.loop(p)
	v := circuitValues{atL: l.Inductance, atC: l.Capacitance + x.trial.ProbeC, atR: l.Resistance, atRs: x.trial.Network.ESR, atE: x.bus,
		atProbe: x.trial.ProbeC, atRef: m.ref}
	if k := m.amps[x.point]; k >= 0 {
		v[atI0] = math.Abs(p[k])
	}
	if x.c >= 0 {
		part := &m.obs.caps[x.c]
		v[atCs] = part.value + part.u*d[x.c]
	}
	if x.r >= 0 {
		part := &m.obs.ohms[x.r]
		v[atRs] += part.value + part.u*d[len(m.obs.caps)+x.r]
	}
	for e, k := range m.effect {
		if k >= 0 {
			v[effectAt[e]] = math.Exp(p[k])
		}
	}
	if x.c < 0 {
		v[atLead] = 0
	}
	return v
}

// effectAt is where each effect stands among a circuit's values.
var effectAt = [noEffects]int{fallTime: atFall, lead: atLead, junction: atShare}

// eval is the residuals of trial x, (predicted - read)/u of each reading it has, with their derivatives.
func (m *model) eval(x *observed, p, d []float64, derivatives bool, b *leastsq.Block) {
	b.R, b.P, b.First, b.Second = b.R[:0], b.P[:0], x.c, x.r
	b.D[0], b.D[1] = b.D[0][:0], b.D[1][:0]
	v := m.values(x, p, d)
	if v[atCs] < 0 || v[atRs] < 0 || math.IsInf(v[atL]*v[atC], 0) || v[atL]*v[atC] == 0 {
		b.R = append(b.R, math.NaN()) // outside of what a circuit can be: the step is refused
		return
	}
	signs, when := v.signs(!math.IsNaN(x.value[peakAt]))
	var slopes [3]circuitValues
	if derivatives {
		slopes = v.slopes(when)
	}
	for k, s := range signs {
		if math.IsNaN(x.value[k]) {
			continue
		}
		b.R = append(b.R, (s-x.value[k])/x.u[k])
		if !derivatives {
			continue
		}
		at := len(b.P)
		for range m.params {
			b.P = append(b.P, 0)
		}
		row := b.P[at:]
		byL, byC := slopes[k][atL]*v[atL], slopes[k][atC]*(v[atC]-x.trial.ProbeC) // by ln L and ln C
		row[0], row[1] = (byL+byC)/x.u[k], (byL-byC)/x.u[k]
		if m.loss >= 0 {
			row[m.loss] = slopes[k][atR] * v[atR] / x.u[k]
		}
		if i := m.amps[x.point]; i >= 0 {
			row[i] = math.Copysign(slopes[k][atI0], p[i]) / x.u[k]
		}
		for e, i := range m.effect {
			if i >= 0 {
				at := effectAt[e]
				row[i] = slopes[k][at] * v[at] / x.u[k]
			}
		}
		var first, second float64
		if x.c >= 0 {
			first = slopes[k][atCs] * m.obs.caps[x.c].u / x.u[k]
		}
		if x.r >= 0 {
			second = slopes[k][atRs] * m.obs.ohms[x.r].u / x.u[k]
		}
		b.D[0], b.D[1] = append(b.D[0], first), append(b.D[1], second)
	}
}

// fit fits the trials that kept lists, from start.
func (m *model) fit(ctx context.Context, kept []int, start []float64, loss leastsq.Loss) (*leastsq.PartitionedResult, error) {
	return leastsq.FitPartitioned(ctx, leastsq.Partitioned{
		Shared: m.params, First: len(m.obs.caps), Second: len(m.obs.ohms), Blocks: len(kept), Start: start,
		Eval: func(i int, p, d []float64, derivatives bool, b *leastsq.Block) {
			m.eval(&m.obs.list[kept[i]], p, d, derivatives, b)
		},
	}, leastsq.Options{Loss: loss, MaxIterations: mostIterations})
}

// mostIterations ends a fit that wanders because the data do not hold an effect; a fit that converges takes some ten.
const mostIterations = 40

// readings counts the readings of the trials that kept lists.
func (m *model) readings(kept []int) int {
	n := 0
	for _, i := range kept {
		n += m.obs.list[i].readings()
	}
	return n
}

func (x *observed) readings() int {
	n := 0
	for _, v := range x.value {
		if !math.IsNaN(v) {
			n++
		}
	}
	return n
}
