package snubber

import (
	"errors"
	"math"
	"sort"
	"sync"
)

// some is a quarter of the draws: enough for a network that is shown beside the choice.
func (p *Prospect) some() []circuitValues { return p.drawn[:(len(p.drawn)+3)/4] }

// prove predicts one network over draws of the prospect. The interval of the peak is that of draws with the parts drawn from
// their tolerances too; WorstV is what the worst corner keeps on the share held of the loops.
func (p *Prospect) prove(n Network, lim Limits, drawn []circuitValues) (*Choice, error) {
	loss, err := SwitchingLoss(p.Loop, n, p.Excitation, lim.SwitchingHz)
	if err != nil {
		return nil, err
	}
	x := &Choice{Network: n.Kind, R: n.R, C: n.C, LossW: loss.Total, ResistorW: loss.Resistor, SwitchW: loss.Switch, LoopW: loss.Loop,
		AddedW: loss.Added, AnywayW: loss.Anyway}
	if db, err := RingLevel(p.Loop, n, p.Excitation); err == nil && p.Loop.Resistance > 0 {
		x.RingDB = &db
	}
	x.settles = p.settling(n, lim.SettleBand)
	peak, damping, err := p.nominal.look(&n)
	if err != nil {
		return nil, err
	}
	excess, least, err := p.excess(n)
	if err != nil {
		return nil, err
	}
	x.Peak, x.Damping = &Estimate{Value: peak}, &Estimate{Value: damping}
	if err := p.spread(x, n, lim, drawn); err != nil {
		return nil, err
	}
	x.Peak.Value, x.Peak.Low, x.Peak.High = x.Peak.Value-excess, x.Peak.Low-excess, x.Peak.High-excess
	x.WorstV -= least
	x.Ratings = Ratings{ResistorW: powerRating(loss.Resistor), CapacitorV: x.WorstV}
	return x, nil
}

// excess is by how much look overstates the peak of a network with a diode, V: for the network itself, and the least of its
// corners. TurnOff, which knows neither the effects nor the draws, is asked with the nominal loop; what it says of the diode
// holds for the others.
func (p *Prospect) excess(n Network) (own, least float64, err error) {
	if n.Kind != RCD {
		return 0, 0, nil
	}
	plain := p.nominal
	plain[atFall], plain[atLead], plain[atShare] = 0, 0, 0
	least = math.Inf(1)
	for i, corner := range corners(n) {
		bound, _, err := plain.look(&corner)
		if err != nil {
			return 0, 0, err
		}
		turn, err := TurnOff(p.Loop, corner, p.Excitation)
		if err != nil {
			return 0, 0, err
		}
		if least = math.Min(least, bound-turn.Peak.Volts); i == 0 {
			own = least
		}
	}
	return own, least, nil
}

// spread fills what the draws say of a choice.
func (p *Prospect) spread(x *Choice, n Network, lim Limits, drawn []circuitValues) error {
	edge, err := p.edges(n, lim.MinDamping > 0)
	if err != nil {
		return err
	}
	if len(drawn) == 0 {
		drawn = []circuitValues{p.nominal}
	}
	type outcome struct{ peak, damping, worst, least []float64 }
	part := func(drawn []circuitValues, from int, o *outcome) error {
		for i := range drawn {
			worst, least := 0.0, 1.0
			for k := range edge {
				v, d, err := drawn[i].look(&edge[k])
				if err != nil {
					return err
				}
				worst, least = math.Max(worst, v), math.Min(least, d)
			}
			m := n
			m.C *= 1 + n.CTol*lattice(from+i, 0)
			m.R *= 1 + n.RTol*lattice(from+i, 1)
			v, d, err := drawn[i].look(&m)
			if err != nil {
				return err
			}
			o.peak, o.damping = append(o.peak, v), append(o.damping, d)
			o.worst, o.least = append(o.worst, worst), append(o.least, least)
		}
		return nil
	}
	var halves [2]outcome
	var errs [2]error
	half := len(drawn) / 2
	var wait sync.WaitGroup
	wait.Go(func() { errs[0] = part(drawn[:half], 0, &halves[0]) })
	errs[1] = part(drawn[half:], half, &halves[1])
	wait.Wait()
	if err := errors.Join(errs[:]...); err != nil {
		return err
	}
	join := func(a, b []float64) []float64 {
		s := append(a, b...)
		sort.Float64s(s)
		return s
	}
	peaks, dampings := join(halves[0].peak, halves[1].peak), join(halves[0].damping, halves[1].damping)
	worst, least := join(halves[0].worst, halves[1].worst), join(halves[0].least, halves[1].least)
	x.WorstV, x.leastDamping = quantile(worst, held), quantile(least, 1-held)
	x.Peak.within(peaks)
	x.Damping.within(dampings)
	if len(p.drawn) == 0 { // the loop is known exactly: only the parts are open, and the corners bound them
		all := corners(n)
		corner(x.Peak, all, func(n *Network) float64 { v, _, _ := p.nominal.look(n); return v })
		corner(x.Damping, all, func(n *Network) float64 { _, d, _ := p.nominal.look(n); return d })
	}
	return nil
}

// edges are the corners of a network's tolerances at which the peak is highest or, where it counts, the damping least, for
// the nominal loop or for one moved by two standard uncertainties along any of the fit's directions: the others need not be looked at in every
// draw.
func (p *Prospect) edges(n Network, damped bool) ([]Network, error) {
	all := corners(n)
	if len(all) == 1 {
		return all, nil
	}
	extreme := make([]bool, len(all))
	look := func(v *circuitValues) error {
		high, low, worst, least := 0.0, 2.0, 0, 0
		for i := range all {
			peak, damping, err := v.look(&all[i])
			if err != nil {
				return err
			}
			if peak > high {
				high, worst = peak, i
			}
			if damping < low {
				low, least = damping, i
			}
		}
		extreme[worst] = true
		extreme[least] = extreme[least] || damped
		return nil
	}
	if err := look(&p.nominal); err != nil {
		return nil, err
	}
	for i := range p.by {
		for _, steps := range []float64{-2, 2} {
			v := p.nominal
			for k := range v {
				v[k] += steps * (p.by[i][k] - p.nominal[k])
			}
			v[atR], v[atI0] = math.Max(v[atR], 0), math.Max(v[atI0], 0)
			if v[atL] <= 0 || v[atC] <= 0 {
				continue
			}
			if err := look(&v); err != nil {
				return nil, err
			}
		}
	}
	var edge []Network
	for i, x := range extreme {
		if x {
			edge = append(edge, all[i])
		}
	}
	return edge, nil
}

// lattice is the i-th of evenly spread values in -1 to 1, in one of two dimensions (Kronecker's sequence of the plastic
// number; Roberts 2018, from memory): the parts' errors are drawn without chance.
func lattice(i, dimension int) float64 {
	const g = 1.32471795724474602596
	step := 1 / g
	if dimension == 1 {
		step = 1 / (g * g)
	}
	x := 0.5 + step*float64(i+1)
	return 2*(x-math.Floor(x)) - 1
}

// within makes the interval and the standard uncertainty those of sorted draws.
func (e *Estimate) within(sorted []float64) {
	mean, sum := 0.0, 0.0
	for _, v := range sorted {
		mean += v / float64(len(sorted))
	}
	for _, v := range sorted {
		sum += (v - mean) * (v - mean)
	}
	e.U = math.Sqrt(sum / float64(max(1, len(sorted)-1)))
	e.Low, e.High = math.Min(e.Value, quantile(sorted, 0.025)), math.Max(e.Value, quantile(sorted, 0.975))
}

// corner makes the interval the extremes over the corners of the tolerances, as bounds of a rectangular distribution.
func corner(e *Estimate, edge []Network, at func(*Network) float64) {
	e.Low, e.High = e.Value, e.Value
	for i := range edge {
		v := at(&edge[i])
		e.Low, e.High = math.Min(e.Low, v), math.Max(e.High, v)
	}
	e.U = (e.High - e.Low) / (2 * math.Sqrt(3))
}

// quantile is the q-th of sorted values, nearest above.
func quantile(sorted []float64, q float64) float64 {
	return sorted[min(len(sorted)-1, max(0, int(math.Ceil(q*float64(len(sorted))))-1))]
}

// corners lists a network at nominal and at the corners of its parts' tolerances.
func corners(n Network) []Network {
	out := []Network{n}
	cs, rs := []float64{n.C}, []float64{n.R}
	if n.CTol > 0 {
		cs = []float64{n.C * (1 - n.CTol), n.C * (1 + n.CTol)}
	}
	if n.RTol > 0 && n.R > 0 {
		rs = []float64{n.R * (1 - n.RTol), n.R * (1 + n.RTol)}
	}
	if len(cs) == 1 && len(rs) == 1 {
		return out
	}
	for _, c := range cs {
		for _, r := range rs {
			m := n
			m.C, m.R = c, r
			out = append(out, m)
		}
	}
	return out
}
