package snubber

import (
	"context"
	"errors"
	"fmt"
	"math"
	"sort"
	"sync"
)

// The range of parts searched, relative to the loop: outside it a capacitor does nothing or costs more than any
// bench accepts, and a resistor is a wire or is not there.
const (
	searchCLow, searchCHigh = 0.1, 100.0 // of the loop's capacitance
	searchRLow, searchRHigh = 0.03, 30.0 // of the loop's impedance
	alternatives            = 5
	held                    = 0.99        // the share of the loops that the fit allows on which the worst corner must keep a limit
	heldSteps               = 2.326347874 // standard uncertainties to that share of a normal distribution, one-sided
	screenSlack             = 0.01        // how far over the limit a network may be screened and still be worth proving
)

// Recommend chooses the network of least loss that keeps the limits with the parts anywhere in tolerance and the loop
// anywhere the fit allows.
//
// First every capacitor is screened with the resistors: the exact peak at the corners of the tolerances, plus what the fit's
// uncertainties add along their independent directions, to first order. For each capacitor the resistor that misses the
// limits least, and then leaves the lowest peak, is kept; the loss is the capacitor's and the resistor hardly changes it. The
// survivors are then proven in order of their loss: for each draw of the prospect the exact peak at every corner that can be the
// worst, of which 99 % must keep the limit. What is shown beside the choice is proven on a quarter of the draws.
//
// An error means that there is nothing to compute; limits that nothing meets are an answer with Met false, whose Choice is
// the nearest miss.
func Recommend(ctx context.Context, p *Prospect, lim Limits) (*Recommendation, error) {
	rec, err := recommend(ctx, p, lim.filled())
	if err != nil {
		return nil, fmt.Errorf("recommending a network: %w", err)
	}
	return rec, nil
}

func recommend(ctx context.Context, p *Prospect, lim Limits) (*Recommendation, error) {
	if err := lim.check(p.Excitation); err != nil {
		return nil, err
	}
	candidates, err := p.screen(ctx, lim)
	if err != nil {
		return nil, err
	}
	rec := &Recommendation{LimitV: lim.MaxPeak, Alternatives: []Choice{}, Warnings: []string{}}
	if rec.Bare, err = p.prove(Network{Kind: Bare}, lim, p.some()); err != nil {
		return nil, err
	}
	var nearest *candidate
	front := math.Inf(1)
	for i := range candidates {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		c := &candidates[i]
		if nearest == nil || c.miss < nearest.miss {
			nearest = c
		}
		if c.miss > screenSlack || c.high >= front || len(rec.Alternatives) == alternatives {
			continue
		}
		drawn := p.drawn
		if rec.Choice != nil {
			drawn = p.some()
		}
		x, err := p.prove(c.network, lim, drawn)
		if err != nil {
			return nil, err
		}
		switch {
		case !x.keeps(lim) || x.WorstV >= front:
			continue
		case rec.Choice == nil:
			rec.Choice, rec.Met = x, true
		default:
			rec.Alternatives = append(rec.Alternatives, *x)
		}
		front = x.WorstV
	}
	if rec.Choice == nil {
		if rec.Choice, err = p.prove(nearest.network, lim, p.drawn); err != nil {
			return nil, err
		}
		rec.Warnings = append(rec.Warnings, lim.cure(rec.Choice))
	}
	if err := p.rate(rec.Choice, lim); err != nil {
		return nil, err
	}
	return rec, p.thumb(rec, lim)
}

// rate gives the whole ratings of a choice, with its capacitor at the worst peak.
func (p *Prospect) rate(x *Choice, lim Limits) error {
	r, err := RatingsOf(p.Loop, lim.network(x.Network, x.R, x.C), p.Excitation, Cycle{Hz: lim.SwitchingHz}, lim.AmbientC)
	if errors.Is(err, ErrNeverSettles) {
		return nil // a loop without any loss: what prove gave stands
	} else if err != nil {
		return err
	}
	if x.WorstV > r.CapacitorV {
		r.CapacitorV, r.CapacitorBuyV = x.WorstV, voltageRating(capMargin*x.WorstV)
		r.StoredJ = x.C * x.WorstV * x.WorstV / 2
	}
	x.Ratings = r
	return nil
}

// thumb adds the rule of thumb.
func (p *Prospect) thumb(rec *Recommendation, lim Limits) error {
	c, err := lim.CSeries.Nearest(3 * p.Loop.Capacitance)
	if err != nil {
		return err
	}
	r, err := lim.RSeries.Nearest(p.Loop.Impedance())
	if err != nil {
		return err
	}
	if rec.RuleOfThumb, err = p.prove(lim.network(RC, r, c), lim, p.some()); err != nil {
		return err
	}
	if s := firstSpike(rec.RuleOfThumb, p.Excitation, lim.MaxPeak); s != "" {
		rec.Warnings = append(rec.Warnings, s)
	}
	return nil
}

// candidate is a network as screened.
type candidate struct {
	network Network
	loss    float64 // W
	high    float64 // V: the peak to first order of all uncertainties
	damping float64 // likewise, at least
	miss    float64 // how far outside the limits
}

// screen gives the candidates in order of their loss, one for each kind and capacitor.
func (p *Prospect) screen(ctx context.Context, lim Limits) ([]candidate, error) {
	cs, rs := lim.OnHandC, lim.OnHandR
	var err error
	if cs == nil {
		if cs, err = lim.CSeries.Between(searchCLow*p.Loop.Capacitance, searchCHigh*p.Loop.Capacitance); err != nil {
			return nil, fmt.Errorf("capacitors near the loop's: %w", err)
		}
	}
	if rs == nil {
		if rs, err = lim.RSeries.Between(searchRLow*p.Loop.Impedance(), searchRHigh*p.Loop.Impedance()); err != nil {
			return nil, fmt.Errorf("resistors near the loop's impedance: %w", err)
		}
	}
	var out []candidate
	for _, k := range lim.Kinds {
		for _, c := range cs {
			if err := ctx.Err(); err != nil {
				return nil, err
			}
			best, err := p.bestResistor(k, c, rs, lim)
			if err != nil {
				return nil, err
			}
			if best != nil {
				out = append(out, *best)
			}
		}
	}
	if len(out) == 0 {
		return nil, errors.New("no part to choose from: no capacitor or no resistor is on hand")
	}
	sort.SliceStable(out, func(i, j int) bool { return out[i].loss < out[j].loss })
	return out, nil
}

// bestResistor is the network of a kind with one capacitor that misses the limits least, and of those the one with the
// lowest peak. Where the peak alone is asked for, only the resistors beside the one with the lowest nominal peak are
// screened in full.
func (p *Prospect) bestResistor(k Kind, c float64, rs []float64, lim Limits) (*candidate, error) {
	if !k.HasR() {
		rs = []float64{0}
	} else if k == RC && lim.MinDamping == 0 && lim.SettleS == 0 && len(rs) > 5 {
		// Effects move the peak and hardly the resistor: without them the way to it is short.
		plain := p.nominal
		plain[atFall], plain[atLead], plain[atShare] = 0, 0, 0
		at, low := 0, math.Inf(1)
		for i, r := range rs {
			n := lim.network(k, r, c)
			peak, _, err := plain.look(&n)
			if err != nil {
				return nil, err
			}
			if peak < low {
				at, low = i, peak
			}
		}
		rs = rs[max(0, at-2):min(len(rs), at+3)]
	}
	var best *candidate
	for _, r := range rs {
		x, err := p.screened(lim.network(k, r, c), lim)
		if err != nil {
			return nil, err
		}
		if best == nil || x.miss < best.miss || x.miss == best.miss && x.better(best) {
			best = x
		}
	}
	return best, nil
}

// better says whether, of two networks with the same capacitor that miss the limits alike, x is to be preferred: for its
// lower peak, or with a diode, which makes the peak the same whatever the resistor, for its damping.
func (x *candidate) better(y *candidate) bool {
	if x.network.Kind == RCD {
		return x.damping > y.damping
	}
	return x.high < y.high
}

// screened is one network to first order.
func (p *Prospect) screened(n Network, lim Limits) (*candidate, error) {
	x := &Choice{leastDamping: 1}
	var worst Network
	for _, corner := range corners(n) {
		peak, damping, err := p.nominal.look(&corner)
		if err != nil {
			return nil, err
		}
		if peak > x.WorstV {
			x.WorstV, worst = peak, corner
		}
		x.leastDamping = math.Min(x.leastDamping, damping)
	}
	var uPeak, uDamping float64
	base, ratio, err := p.nominal.look(&worst)
	if err != nil {
		return nil, err
	}
	for i := range p.by {
		peak, damping, err := p.by[i].look(&worst)
		if err != nil {
			return nil, err
		}
		uPeak, uDamping = math.Hypot(uPeak, peak-base), math.Hypot(uDamping, damping-ratio)
	}
	x.WorstV += heldSteps * uPeak
	x.leastDamping -= heldSteps * uDamping
	loss, err := SwitchingLoss(p.Loop, n, p.Excitation, lim.SwitchingHz)
	if err != nil {
		return nil, err
	}
	x.LossW = loss.Total
	if lim.SettleS > 0 {
		x.settles = p.settling(n, lim.SettleBand)
	}
	return &candidate{network: n, loss: loss.Total, high: x.WorstV, damping: x.leastDamping, miss: x.misses(lim)}, nil
}

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
	x.Peak, x.Damping = &Estimate{Value: peak}, &Estimate{Value: damping}
	if err := p.spread(x, n, drawn); err != nil {
		return nil, err
	}
	x.Ratings = Ratings{ResistorW: powerRating(loss.Resistor), CapacitorV: x.WorstV}
	return x, nil
}

// spread fills what the draws say of a choice.
func (p *Prospect) spread(x *Choice, n Network, drawn []circuitValues) error {
	edge, err := p.edges(n)
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

// edges are the corners of a network's tolerances at which the peak is highest or the damping least, for the nominal loop
// or for one moved by two standard uncertainties along any of the fit's directions: the others need not be looked at in every
// draw.
func (p *Prospect) edges(n Network) ([]Network, error) {
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
		extreme[worst], extreme[least] = true, true
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

// look is the peak and the damping ratio of a network.
//
// Of a network with a diode across its resistor the peak is the charging diode's: where the node stands highest its slope
// is zero, so that all the loop's current flows on into the network, forward through the diode. Up to there the circuit is an
// RC whose resistance is R beside the diode's, with the diode's drop against it; the drop added to that RC's peak bounds it
// from above (TurnOff has it exactly). Its ring is damped by R once the diode has let go.
func (v *circuitValues) look(n *Network) (peak, damping float64, err error) {
	if n.Kind != RCD {
		peak, damping = v.predict(n)
		return peak, damping, nil
	}
	on, off := *n, *n
	on.Kind, off.Kind = RC, RC
	on.R = n.R * n.DiodeOhm / (n.R + n.DiodeOhm)
	peak, _ = v.predict(&on)
	_, damping = v.predict(&off)
	return peak + n.DiodeDrop, damping, nil
}

// settling is the time after which the node stays within band of the bus, with the nominal loop, s: where the envelope of
// what still rings has fallen to it.
func (p *Prospect) settling(n Network, band float64) float64 {
	v := p.nominal
	v[atCs], v[atRs] = n.C, n.SeriesOhm()
	r := v.respond()
	limit := band * v[atE]
	rate := r.modes.slowest()
	if r.modes.third {
		rate = math.Min(rate, -r.modes.p)
	}
	if !(rate > 0) {
		return math.Inf(1)
	}
	// The last time outside the band, looked for backwards from where all has died away.
	end := 0.0
	span := 20 / rate
	step := math.Min(span/400, 0.1)
	for tau := 0.0; tau < span; tau += step {
		if math.Abs(r.node.at(r.modes.basis(tau))) > limit {
			end = tau + step
		}
	}
	return end / r.w0
}
