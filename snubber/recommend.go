package snubber

import (
	"context"
	"errors"
	"fmt"
	"math"
)

// The range of parts searched, relative to the loop: outside it a capacitor does nothing or costs more than any
// bench accepts, and a resistor is a wire or is not there.
const (
	searchCLow, searchCHigh = 0.1, 100.0 // of the loop's capacitance
	searchRLow, searchRHigh = 0.03, 30.0 // of the loop's impedance
	alternatives            = 5
	held                    = 0.99        // the share of the loops that the fit allows on which the worst corner must keep a limit
	heldSteps               = 2.326347874 // standard uncertainties to that share of a normal distribution, one-sided
	clearMiss               = 0.003       // how far over the limit on a quarter of the draws a network is given up
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
	rec := &Recommendation{LimitV: lim.MaxPeak, Alternatives: []Choice{}, Warnings: []string{},
		Loop: p.Loop, Excitation: p.Excitation, SwitchingHz: lim.SwitchingHz}
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
		// A quarter of the draws first: most that miss do so clearly.
		x, err := p.prove(c.network, lim, p.some())
		if err != nil {
			return nil, err
		}
		if rec.Choice == nil && x.misses(lim) < clearMiss {
			if x, err = p.prove(c.network, lim, p.drawn); err != nil {
				return nil, err
			}
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
		if e := p.Excitation; lim.MaxPeak <= e.Bus {
			rec.Warnings = append(rec.Warnings, fmt.Sprintf("the peak limit of %g V is not above the bus of %g V, where the node settles, so no network can keep it; raise the limit or the device's rating, or lower the bus", lim.MaxPeak, e.Bus))
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
