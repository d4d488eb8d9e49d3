package snubber

import (
	"context"
	"errors"
	"fmt"
	"math"
	"sort"
	"sync"
)

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
	// Two workers share the capacitors between them; each writes its own places, so that the order is always the same.
	found := make([]*candidate, len(lim.Kinds)*len(cs))
	var errs [2]error
	var wait sync.WaitGroup
	for worker := range errs {
		wait.Go(func() {
			for i := worker; i < len(found); i += len(errs) {
				if errs[worker] = ctx.Err(); errs[worker] != nil {
					return
				}
				if found[i], errs[worker] = p.bestResistor(lim.Kinds[i/len(cs)], cs[i%len(cs)], rs, lim); errs[worker] != nil {
					return
				}
			}
		})
	}
	wait.Wait()
	if err := errors.Join(errs[:]...); err != nil {
		return nil, err
	}
	var out []candidate
	for _, x := range found {
		if x != nil {
			out = append(out, *x)
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
		try := func(i int) {
			x := plain
			x[atCs], x[atRs] = c, rs[i]
			if peak := x.respond().Peak().Volts; peak < low {
				at, low = i, peak
			}
		}
		// The peak has one valley over R: every fourth resistor finds it, and those between its neighbours the bottom.
		for i := 0; i < len(rs); i += 4 {
			try(i)
		}
		for i, end := max(0, at-3), min(len(rs), at+4); i < end; i++ {
			try(i)
		}
		// Far from the limit the one resistor tells enough: there is nothing to choose, or all of them hold.
		reach := 2
		if math.Abs(low/lim.MaxPeak-1) > 0.15 {
			reach = 0
		}
		rs = rs[max(0, at-reach):min(len(rs), at+reach+1)]
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

// look is the peak and the damping ratio of a network.
//
// Of a network with a diode across its resistor the peak is the charging diode's: where the node stands highest its slope
// is zero, so that all the loop's current flows on into the network, forward through the diode. Up to there the circuit is an
// RC whose resistance is R beside the diode's, with the diode's drop against it; the drop added to that RC's peak bounds it
// from above, and prove takes off by how much. Its ring is damped by R once the diode has let go.
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
