package recipes

import (
	"context"
	_ "embed"
	"errors"
	"fmt"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// Request is what a recommendation is asked to keep. What is left zero comes from the trials and the board.
type Request struct {
	snubber.Limits
	Derate float64 // share of the device's rating used as the limit where MaxPeak is zero; 0: 0.8, common practice
}

const usualDerate = 0.8

// A recommendation is proven on so many draws of the fit, always the same ones.
const (
	draws = 2000
	seed  = 1
)

// Recommendation fits the trials in scope and recommends a network for them.
func Recommendation(ctx context.Context, src Source) (*snubber.FitResult, *snubber.Recommendation, error) {
	trials, err := src.Trials(ctx)
	if err != nil {
		return nil, nil, err
	}
	fit, err := snubber.Fit(ctx, trials)
	if err != nil {
		return nil, nil, err
	}
	at := fit.Hardest(trials)
	ahead, notes, err := fit.Ahead(at, draws, seed)
	if err != nil {
		return nil, nil, err
	}
	lim := src.Limits.Limits
	if lim.SwitchingHz == 0 {
		lim.SwitchingHz = at.SwitchingHz
	}
	if lim.SwitchingHz == 0 {
		return nil, nil, errors.New("recommending a network: no trial states a switching frequency and none was given, so the loss is unknown; give --switching-hz")
	}
	if lim.MaxPeak == 0 {
		if lim.MaxPeak, err = src.ratedPeak(ctx, fit.Board); err != nil {
			return nil, nil, err
		}
	}
	rec, err := snubber.Recommend(ctx, ahead, lim)
	if err != nil {
		return nil, nil, err
	}
	rec.Warnings = append(append(append([]string{}, fit.Warnings...), notes...), rec.Warnings...)
	return fit, rec, nil
}

// ratedPeak is the board's device rating times the derating.
func (s Source) ratedPeak(ctx context.Context, board string) (float64, error) {
	boards, err := s.Logbook.Boards(ctx)
	if err != nil {
		return 0, err
	}
	derate := s.Limits.Derate
	if derate == 0 {
		derate = usualDerate
	}
	for _, b := range boards {
		if b.Name == board && b.DeviceV > 0 {
			return b.DeviceV * derate, nil
		}
	}
	return 0, fmt.Errorf("recommending a network: board %q has no voltage rating and no limit was given; give --max-peak, or the rating by `ringbook board add`", board)
}

//go:embed choice.go
var choiceSource string

// Choice is the page of a recommendation: the network of least loss whose peak stays under the limit, with its parts anywhere
// in tolerance and the loop anywhere the trials allow; and what else would do.
func Choice(ctx context.Context, p *page.Page, src Source) error {
	p.Weave(choiceSource)

	// ## The choice
	//
	// The loop is fitted from the trials; networks are then searched over the series, screened by their sensitivities and
	// proven on draws of the fit with the parts at the corners of their tolerances.
	fit, rec, err := Recommendation(ctx, src)
	if err != nil {
		return err
	}
	ChoicePage(p, fit, rec)

	// ## With and without
	//
	// The closed form of the node's voltage after the switch lets go, for the loop as fitted.
	network := src.network(rec)
	p.Plot(withAndWithoutPlot(rec, network))

	// ## What a lower peak costs
	//
	// Every alternative is the cheapest for its peak. The peak is that at worst, the loss that of ring and network.
	p.Plot(frontPlot(rec))

	// Peak and loss for any R and C, with parts as marked on them. The loss goes with C; R has its best value for each C.
	grid, err := networkPlot(ctx, rec)
	if err != nil {
		return err
	}
	p.Plot(grid)
	return nil
}

// network is the network chosen.
func (s Source) network(rec *snubber.Recommendation) snubber.Network {
	c := rec.Choice
	n := snubber.Network{Kind: c.Network, C: c.C, R: c.R}
	if c.Network == snubber.RCD {
		n.DiodeDrop, n.DiodeOhm = s.Limits.DiodeDrop, s.Limits.DiodeOhm
	}
	return n
}

// ChoicePage puts a recommendation on a page: the networks side by side, what to buy, and what to mind.
func ChoicePage(p *page.Page, fit *snubber.FitResult, rec *snubber.Recommendation) {
	c := rec.Choice
	if rec.Met {
		p.Say("Fit **%s** across the switch.", c.InWords())
	} else {
		p.Say("**No network of these series keeps the limits.** The nearest miss is shown.")
	}
	p.Table(networksTable(rec))
	if rec.Met {
		p.Figures(ratingFigures(c.Ratings)...)
		p.Say("Of its %s the network adds %s; %s the loop loses anyway, now mostly in the resistor.", quantity.Format(c.LossW, quantity.Power, 3), quantity.Format(c.AddedW, quantity.Power, 3), quantity.Format(c.AnywayW, quantity.Power, 3))
		if c.RingDB != nil {
			p.Say("In the spectrum the ring stands %.0f dB below the bare node's.", -*c.RingDB)
		}
		for _, advice := range c.Ratings.Advice {
			p.Say("%s", advice)
		}
	}
	for _, w := range rec.Warnings {
		p.Warn("%s.", w)
	}
}

// ratingFigures are what the parts to buy must stand; what the network does not have is left out.
func ratingFigures(r snubber.Ratings) []page.Figure {
	var list []page.Figure
	for _, x := range []struct {
		name, csv, remark string
		unit              quantity.Unit
		value             float64
	}{
		{"resistor to buy", "resistor_w", "twice its loss, next rating above", quantity.Power, r.ResistorW},
		{"resistor's pulse, each edge", "pulse_j", "", quantity.Energy, r.PulseJ},
		{"resistor's peak current", "resistor_peak_a", "", quantity.Current, r.ResistorPeakA},
		{"capacitor to buy", "capacitor_buy_v", "half as much again as it sees, next rating above", quantity.Voltage, r.CapacitorBuyV},
		{"capacitor sees", "capacitor_v", "at worst", quantity.Voltage, r.CapacitorV},
		{"capacitor's RMS current", "capacitor_rms_a", "", quantity.Current, r.CapacitorRMSA},
		{"capacitor's peak current", "capacitor_peak_a", "", quantity.Current, r.CapacitorPeakA},
		{"capacitor's dv/dt", "capacitor_v_per_us", "in a microsecond", quantity.Voltage, r.CapacitorVPerS * 1e-6},
		{"diode's peak current", "diode_peak_a", "", quantity.Current, r.DiodePeakA},
		{"diode's recovery, at most", "diode_recovery_s", "", quantity.Time, r.DiodeRecoveryS},
	} {
		if x.value > 0 {
			list = append(list, page.Figure{Name: x.name, CSV: x.csv, Unit: x.unit, Value: x.value, Remark: x.remark})
		}
	}
	return list
}
