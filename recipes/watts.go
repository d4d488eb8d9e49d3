package recipes

import (
	"context"
	_ "embed"
	"errors"
	"fmt"
	"math"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"
)

//go:embed watts.go
var wattsSource string

// Watts is the page of what networks cost: the power that the supply gave with each, beside what was computed.
func Watts(ctx context.Context, p *page.Page, src Source) error {
	p.Weave(wattsSource)

	// ## What the supply gave
	//
	// The supply's power is its voltage times its current, where both were read. What a network costs is that power less
	// the bare node's at the same bus, load and switching frequency; the converter's other losses, the same with and without,
	// drop out.
	trials, err := src.Trials(ctx)
	if err != nil {
		return err
	}
	fit, err := src.Fit(ctx, trials)
	if err != nil {
		return err
	}

	// What was computed is what the network adds to the loss of the ring, from the loop as fitted: mostly Cs E² f. What the
	// loop loses anyway, now in the resistor, is in both.
	rows, err := wattsOf(fit, trials)
	if err != nil {
		return err
	}
	p.Table(wattsTable(rows))
	p.Plot(wattsPlot(rows))
	return nil
}

// watts is what a trial's supply gave.
type watts struct {
	trial             snubber.Trial
	supply            snubber.Estimate // W
	measured, compute *float64         // W more than bare; nil: not known
	u                 float64          // W, standard uncertainty of measured
}

// wattsOf are the powers of the trials that read the supply, against the bare node's at the same operating point.
func wattsOf(fit *snubber.FitResult, trials []snubber.Trial) ([]watts, error) {
	var out []watts
	for _, t := range trials {
		amps, ok := t.Reading(snubber.SupplyA)
		at := t.Operating()
		if !ok || !(at.BusV > 0) || t.Struck != "" {
			continue
		}
		var uBus float64
		if bus, ok := t.Reading(snubber.BusV); ok {
			uBus = bus.U
		}
		w := watts{trial: t}
		w.supply.Value = at.BusV * amps.Value
		w.supply.U = math.Hypot(at.BusV*amps.U, amps.Value*uBus)
		out = append(out, w)
	}
	if len(out) == 0 {
		return nil, errors.New("no trial read the supply's current with its voltage; read supply_a and bus_v")
	}
	for i := range out {
		x := &out[i]
		if x.trial.Network.Kind == snubber.Bare {
			continue
		}
		if add, ok := addedW(fit, x.trial); ok {
			x.compute = &add
		}
		if bare := bareBeside(out, x.trial); bare != nil {
			more := x.supply.Value - bare.supply.Value
			x.measured, x.u = &more, math.Hypot(x.supply.U, bare.supply.U)
		}
	}
	return out, nil
}

// bareBeside is the bare trial at a trial's operating point that was read nearest to it in time.
func bareBeside(all []watts, t snubber.Trial) *watts {
	var best *watts
	at := t.Operating()
	for i := range all {
		b := &all[i]
		o := b.trial.Operating()
		if b.trial.Network.Kind != snubber.Bare || apart(o.BusV, at.BusV) || apart(o.CurrentA, at.CurrentA) || apart(o.SwitchingHz, at.SwitchingHz) {
			continue
		}
		if best == nil || b.trial.At.Sub(t.At).Abs() < best.trial.At.Sub(t.At).Abs() {
			best = b
		}
	}
	return best
}

// addedW is what a trial's network adds to the loss, W.
func addedW(fit *snubber.FitResult, t snubber.Trial) (w float64, ok bool) {
	at := t.Operating()
	if !(at.SwitchingHz > 0) || fit.Loop.Inductance == nil || fit.Loop.Capacitance == nil {
		return 0, false
	}
	var e snubber.Excitation
	for _, x := range fit.Excitations {
		if !apart(x.BusV, at.BusV) && (x.CurrentA == 0 || !apart(x.CurrentA, at.CurrentA)) {
			e.Current = x.Excitation.Value
		}
	}
	e.Bus = at.BusV
	loss, err := snubber.SwitchingLoss(fit.Nominal(), t.Network, e, at.SwitchingHz)
	return loss.Added, err == nil
}

func wattsTable(rows []watts) *page.Table {
	t := page.NewTable("Power by network",
		page.Label("trial", "trial"), page.Label("network", "network"),
		page.Part("C", quantity.Capacitance, "c"), page.Part("R", quantity.Resistance, "r"),
		page.Number("bus", quantity.Voltage, "bus_v"), page.Number("load", quantity.Current, "current_a"),
		page.Measured("supply", quantity.Power, "supply_w"), page.Measured("more than bare", quantity.Power, "measured_w"),
		page.Number("computed", quantity.Power, "computed_w"))
	for _, x := range rows {
		var measured, computed any
		if x.measured != nil {
			measured = snubber.Estimate{Value: *x.measured, U: x.u}
		}
		if x.compute != nil {
			computed = *x.compute
		}
		n, at := x.trial.Network, x.trial.Operating()
		row := t.Row(store.ShortID(x.trial.ID), string(n.Kind), orNone(n.C), orNone(n.R), at.BusV, orNone(at.CurrentA), x.supply, measured, computed)
		switch {
		case n.Kind != snubber.Bare && measured == nil:
			row.Note("no bare trial at this operating point read the supply")
		case measured != nil && computed != nil && math.Abs(*x.measured-*x.compute) > 3*x.u+0.1**x.compute:
			row.Note("measured and computed differ by more than their uncertainty and a tenth: the load may have changed, or the network is not what it says")
		}
	}
	return t
}

// wattsPlot is what was measured over what was computed.
func wattsPlot(rows []watts) *page.Plot {
	p := page.NewPlot("What networks cost: measured over computed",
		page.LinearAxis("computed", quantity.Power, "computed_w"), page.LinearAxis("measured, more than bare", quantity.Power, "measured_w"))
	var c, m, u []float64
	most := 0.0
	for _, x := range rows {
		if x.measured != nil && x.compute != nil {
			c, m, u = append(c, *x.compute), append(m, *x.measured), append(u, x.u)
			most = math.Max(most, *x.compute)
		}
	}
	p.Points(fmt.Sprintf("%s with a network", count(len(c), "trial")), c, m).K1(u)
	p.Line("as computed", []float64{0, most}, []float64{0, most})
	return p
}
