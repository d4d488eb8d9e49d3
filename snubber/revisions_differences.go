package snubber

import (
	"fmt"
	"math"

	"ringbook/snubber/leastsq"
)

// figure is a quantity of one revision.
type figure struct {
	quantity string
	value    float64
	by       []float64 // its derivatives by the parameters of all revisions
	own      float64   // standard uncertainty of the revision's own, beyond the fit's
	positive bool      // its interval is even in ratio, as the fit gives it
}

// describe gives the figures of the revisions and their differences.
func (t *together) describe(c *Comparison) {
	e := t.estimator()
	if e.widen > 1 {
		c.Warnings = append(c.Warnings, fmt.Sprintf("all revisions together scatter %.3g times more than they do apart (chi-square %.3g for %s of freedom): the intervals of the differences were widened by that; look for parts of the same words that are not the same",
			e.widen, t.fit.Chi2, degrees(t.dof())))
	}
	var all [][]figure
	for k, f := range c.Fits {
		figures := t.loop(k, f)
		r := RevisionFigures{Board: f.Board, Revision: f.Revision}
		if x := t.excitation(k, f, c.Point); x != nil {
			figures = append(figures, *x)
		}
		x, notes := t.peak(k, f, c.Point)
		for _, n := range notes {
			c.Warnings = append(c.Warnings, "peak of "+c.name(k)+": "+n)
		}
		if x != nil {
			figures = append(figures, *x)
		}
		e := t.about(e, k)
		for i := range figures {
			*r.of(figures[i].quantity) = e.figure(&figures[i])
		}
		c.Revisions = append(c.Revisions, r)
		all = append(all, figures)
	}
	for k := range all[1:] {
		for i := range all[0] {
			for j := range all[k+1] {
				a, b := &all[0][i], &all[k+1][j]
				if a.quantity == b.quantity {
					d := t.about(e, 0, k+1).difference(a, b)
					d.From, d.To = c.name(0), c.name(k+1)
					c.Differences = append(c.Differences, d)
				}
			}
		}
	}
}

// of is where the estimate of a quantity stands.
func (r *RevisionFigures) of(quantity string) **Estimate {
	switch quantity {
	case "inductance_h":
		return &r.Loop.Inductance
	case "capacitance_f":
		return &r.Loop.Capacitance
	case "resistance_ohm":
		return &r.Loop.Resistance
	case "impedance_ohm":
		return &r.Loop.Impedance
	case "ring_hz":
		return &r.Loop.RingHz
	case "excitation_a":
		return &r.Excitation
	}
	return &r.Peak
}

// estimator is that of the fit of all, whose model is known to it by its parts and the number of its parameters alone.
func (t *together) estimator() *estimator {
	e := &estimator{widen: t.scatter(), outcome: &outcome{fit: t.fit, model: &model{params: t.params,
		obs: &observations{caps: t.parts[capacitors], ohms: t.parts[resistors]}}}}
	e.prepare()
	var own, b leastsq.Block
	for i := range t.blocks {
		if x := &t.blocks[i]; x.dof != [3]float64{} {
			t.eval(x, t.fit.P, t.fit.D, true, &own, &b)
			e.repeats(x.observed, &b)
		}
	}
	return e
}

// about is the estimator of what is said of the given revisions: where one of them or all together scatter more than they
// state, it counts the fewest degrees of freedom behind that.
func (t *together) about(e *estimator, revisions ...int) *estimator {
	some := *e
	count := func(dof int) {
		if d := float64(dof); some.student == 0 || d < some.student {
			some.student = d
		}
	}
	if e.widen > 1 {
		count(t.dof())
	}
	for _, k := range revisions {
		if t.scale[k] > 1 {
			count(t.outs[k].model.readings(t.outs[k].kept) - t.outs[k].model.params)
		}
	}
	return &some
}

// figure is the estimate of one revision's quantity.
func (e *estimator) figure(x *figure) *Estimate {
	if !x.positive {
		u, law := e.spread(x.by, x.own)
		out := law.estimate(x.value, u)
		out.Low = math.Max(0, out.Low)
		return out
	}
	g := make([]float64, len(x.by))
	for i, v := range x.by {
		g[i] = v / x.value
	}
	out := e.relative(x.value, g)
	if x.own > 0 {
		out.allow(x.own / x.value)
	}
	return out
}

// difference is b less a, with the covariance of the two.
func (e *estimator) difference(a, b *figure) Difference {
	d := Difference{Quantity: a.quantity}
	g := make([]float64, len(a.by))
	for i := range g {
		g[i] = b.by[i] - a.by[i]
	}
	u, l := e.spread(g, math.Hypot(a.own, b.own))
	d.Delta = l.estimate(b.value-a.value, u)
	d.ProbabilityReal = 0.5
	if u > 0 {
		d.ProbabilityReal += l.inside(math.Abs(d.Delta.Value)/u) / 2
	}
	if !(a.value > 0 && b.value > 0) {
		return d
	}
	for i := range g {
		g[i] = b.by[i]/b.value - a.by[i]/a.value
	}
	u, l = e.spread(g, math.Hypot(a.own/a.value, b.own/b.value))
	ratio, k := b.value/a.value, l.factor()
	d.Relative = &Estimate{Value: ratio - 1, U: ratio * u, Low: ratio*math.Exp(-k*u) - 1, High: ratio*math.Exp(k*u) - 1, DOF: l.dof}
	return d
}

// gradient places derivatives by the parameters of revision k among those of all.
func (t *together) gradient(k int, by map[int]float64) []float64 {
	g := make([]float64, t.params)
	for j, v := range by {
		g[t.first[k]+j] = v
	}
	return g
}

// own are the parameters of revision k.
func (t *together) own(k int) []float64 {
	return t.fit.P[t.first[k] : t.first[k]+t.models[k].params]
}

// loop is the loop of revision k, as describe gives that of a fit.
func (t *together) loop(k int, f *FitResult) []figure {
	m := t.models[k]
	l := m.loop(t.own(k))
	rest := 0.0
	if m.ref > 0 && m.effect[junction] < 0 {
		rest = atRest
	}
	var out []figure
	add := func(quantity string, v, rest float64, by map[int]float64) {
		for j := range by {
			by[j] *= v
		}
		out = append(out, figure{quantity: quantity, value: v, by: t.gradient(k, by), own: rest * v, positive: true})
	}
	add("inductance_h", l.Inductance, 0, map[int]float64{0: 1, 1: 1})
	add("capacitance_f", l.Capacitance, rest, map[int]float64{0: 1, 1: -1})
	add("impedance_ohm", l.Impedance(), rest/2, map[int]float64{1: 1})
	if f.Loop.Resistance != nil {
		add("resistance_ohm", l.Resistance, 0, map[int]float64{m.loss: 1})
	}
	add("ring_hz", l.NaturalHz(), rest/2, map[int]float64{0: -1})
	return out
}

// excitation is the current of revision k at an operating point where it read a peak; nil where it did not.
func (t *together) excitation(k int, f *FitResult, at OperatingPoint) *figure {
	point, _, u, err := f.driving(at)
	switch {
	case err != nil || point < 0 || !(at.BusV > 0):
		return nil
	case t.models[k].amps[point] < 0:
		return &figure{quantity: "excitation_a", by: t.gradient(k, nil), own: u}
	}
	j := t.models[k].amps[point]
	p := t.own(k)[j]
	return &figure{quantity: "excitation_a", value: math.Abs(p), by: t.gradient(k, map[int]float64{j: math.Copysign(1, p)})}
}

// peak is the bare node's peak of revision k at an operating point, by Ahead's rules; nil where it is not known. The notes
// say why, or what was taken for granted.
func (t *together) peak(k int, f *FitResult, at OperatingPoint) (*figure, []string) {
	if !(at.BusV > 0) {
		return nil, []string{"not predicted, since the bus voltage is not known; state bus_v with the trials, or read it"}
	}
	point, amps, ampsU, err := f.driving(at)
	if err != nil {
		return nil, []string{"not predicted, since " + err.Error()}
	}
	var notes []string
	if f.Loop.Resistance == nil {
		notes = append(notes, noteNoLoss)
	}
	if point < 0 {
		notes = append(notes, noteLoad(at))
	}
	m, p := t.models[k], append([]float64{}, t.own(k)...)
	j := -1
	if point >= 0 {
		j = m.amps[point]
	}
	peak := func(amps, rest float64) float64 {
		if j >= 0 {
			amps = math.Abs(p[j])
		}
		v := m.driven(p, at.BusV, amps, rest)
		volts, _ := v.predict(&Network{Kind: Bare})
		return volts
	}
	x := &figure{quantity: "peak_v", value: peak(amps, 1)}
	by := map[int]float64{}
	for i, was := range p {
		h := 1e-4
		if i == j {
			h *= math.Max(math.Abs(was), at.BusV/m.loop(p).Impedance())
		}
		p[i] = was + h
		high := peak(amps, 1)
		p[i] = was - h
		by[i] = (high - peak(amps, 1)) / (2 * h)
		p[i] = was
	}
	x.by = t.gradient(k, by)
	x.own = math.Abs(peak(amps, 1+atRest) - x.value)
	if ampsU > 0 {
		x.own = math.Hypot(x.own, peak(amps+ampsU, 1)-x.value)
	}
	return x, notes
}
