package main

import (
	"context"
	"fmt"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/preferred"
	"ringbook/snubber/quantity"
	"ringbook/store"

	"github.com/spf13/cobra"
)

func recommendCommand(a *app) *cobra.Command {
	var scope scopeFlags
	var maxPeak quantity.Volt
	var derate, minDamping, cTol, rTol quantity.Fraction
	var maxLoss quantity.Watt
	var hz quantity.Hertz
	cSeries, rSeries := preferred.E12, preferred.E24
	network := "rc"
	var cOnHand, rOnHand []string
	var settle quantity.Second
	var band quantity.Fraction
	var drop quantity.Volt
	var diodeOhm quantity.Ohm
	var ambient float64
	var noRecord bool
	cmd := &cobra.Command{
		Use:   "recommend",
		Short: "R and C, ratings, losses, alternatives",
		Long: `recommend fits the trials in scope and gives the network of least loss whose peak, with the parts anywhere in
tolerance and the loop anywhere the trials allow, stays under the limit: --max-peak, or the board's device rating times
--derate. When nothing keeps the limits the nearest miss is shown and the exit code is 3.

A network that keeps them is logged as a decision with the trials it rests on, for ringbook confirm to hold what is then
measured against; asked the same of the same trials, the decision stands. With --no-record the logbook stays as it is.`,
		Example: `  ringbook recommend --board winch-drive --revision B --max-peak 80V
  ringbook recommend --max-peak 80V --c-tol 5% --r-tol 1% --c-series E6 --json
  ringbook recommend --network any --min-damping 30% --c-on-hand 270p,470p,1n0`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			kinds, ok := map[string][]snubber.Kind{"rc": {snubber.RC}, "c": {snubber.C}, "rcd": {snubber.RCD}, "any": {snubber.C, snubber.RC, snubber.RCD}}[network]
			if !ok {
				return usagef("--network %q: it must be one of rc, c, rcd, any", network)
			}
			cs, err := partsOnHand("c-on-hand", cOnHand, func() flagValue { return new(quantity.Farad) })
			if err != nil {
				return err
			}
			rs, err := partsOnHand("r-on-hand", rOnHand, func() flagValue { return new(quantity.Ohm) })
			if err != nil {
				return err
			}
			for _, tol := range []struct {
				flag  string
				value quantity.Fraction
			}{{"c-tol", cTol}, {"r-tol", rTol}} {
				if tol.value >= 1 {
					return usagef("--%s %v: a part of that tolerance may be nothing at all; write for example 5%%", tol.flag, tol.value)
				}
			}
			src, err := a.source(ctx, &scope)
			if err != nil {
				return err
			}
			defer closing(src.Logbook, &err)
			src.Limits = recipes.Request{
				Limits: snubber.Limits{
					MaxPeak: float64(maxPeak), MinDamping: float64(minDamping), MaxLoss: float64(maxLoss),
					SwitchingHz: float64(hz), CSeries: cSeries, RSeries: rSeries, CTol: float64(cTol), RTol: float64(rTol),
					Kinds: kinds, OnHandC: cs, OnHandR: rs, SettleS: float64(settle), SettleBand: float64(band),
					DiodeDrop: float64(drop), DiodeOhm: float64(diodeOhm), AmbientC: ambient,
				},
				Derate: float64(derate),
			}
			fit, rec, err := recipes.Recommendation(ctx, src)
			if err != nil {
				return err
			}
			var decision *string
			if rec.Met && !noRecord {
				if decision, err = a.decide(ctx, src, fit, rec); err != nil {
					return err
				}
			}
			if a.json {
				err = a.printJSON(struct {
					*snubber.Recommendation
					Decision *string `json:"decision"` // its id; null where none was logged
				}{rec, decision})
			} else {
				p := page.New("Network for " + src.Scope.Board + " " + src.Scope.Revision)
				recipes.ChoicePage(p, fit, rec)
				err = a.print(p)
			}
			if err == nil && !rec.Met {
				return errNo
			}
			return err
		},
	}
	scope.add(cmd)
	f := cmd.Flags()
	f.Var(&maxPeak, "max-peak", "highest voltage allowed across the switch")
	f.Var(&derate, "derate", "share of the device's rating taken as the limit without --max-peak (80%)")
	f.Var(&minDamping, "min-damping", "least damping ratio of the ring")
	f.Var(&maxLoss, "max-loss", "most power the ring and the network may lose")
	f.Var(&hz, "switching-hz", "switching frequency, where the trials state none or another is meant")
	f.Var(&cTol, "c-tol", "tolerance of the capacitor to buy, such as 5%")
	f.Var(&rTol, "r-tol", "tolerance of the resistor to buy, such as 1%")
	f.Var(&cSeries, "c-series", "IEC 60063 series of the capacitor")
	f.Var(&rSeries, "r-series", "IEC 60063 series of the resistor")
	f.BoolVar(&noRecord, "no-record", false, "log no decision")
	f.StringVar(&network, "network", network, "`KIND` to recommend: rc, c, rcd, or any of them")
	f.StringSliceVar(&cOnHand, "c-on-hand", nil, "choose among these `CAPACITORS` alone, such as 270p,330p")
	f.StringSliceVar(&rOnHand, "r-on-hand", nil, "choose among these `RESISTORS` alone, such as 4R7,10R")
	f.Var(&settle, "settle-s", "time from which the node must stay near the bus")
	f.Var(&band, "settle-band", "how near, as a share of the bus (5%)")
	f.Var(&drop, "diode-drop", "forward drop of the diode of an rcd network (0.8V)")
	f.Var(&diodeOhm, "diode-ohm", "its on-resistance (100m)")
	f.Float64Var(&ambient, "ambient-c", 25, "temperature where the resistor is, degrees Celsius")
	completes(cmd, "network", "rc", "c", "rcd", "any")
	return cmd
}

type flagValue interface {
	Set(string) error
}

// partsOnHand reads the values of the parts on hand; nil where none is named.
func partsOnHand(flag string, texts []string, make func() flagValue) ([]float64, error) {
	var values []float64
	for _, text := range texts {
		v := make()
		if err := v.Set(text); err != nil {
			return nil, usagef("--%s: %w", flag, err)
		}
		switch v := v.(type) {
		case *quantity.Farad:
			values = append(values, float64(*v))
		case *quantity.Ohm:
			values = append(values, float64(*v))
		}
	}
	return values, nil
}

// decide logs the recommendation as a decision and says so. The answer does not depend on the log: where it cannot be
// written, that is one more warning, and the id is nil.
func (a *app) decide(ctx context.Context, src recipes.Source, fit *snubber.FitResult, rec *snubber.Recommendation) (id *string, err error) {
	logged, fresh, err := func() (id string, fresh bool, err error) {
		// The last to close the file moves the write-ahead log into it, which one that reads alone cannot do.
		if err := src.Logbook.Close(); err != nil {
			return "", false, err
		}
		if src.Logbook, err = a.open(ctx); err != nil {
			return "", false, err
		}
		defer closing(src.Logbook, &err)
		return recipes.Decide(ctx, src, fit, rec)
	}()
	switch {
	case err != nil && ctx.Err() != nil:
		return nil, err
	case err != nil:
		rec.Warnings = append(rec.Warnings, fmt.Sprintf("the decision is not logged, so that nothing can confirm it: %v", err))
		return nil, nil
	case a.json: // its own field says it
	case fresh:
		a.progress("decision %s is logged; fit it, take a trial, and hold that against it with `ringbook confirm`", store.ShortID(logged))
	default:
		a.progress("decision %s stands; hold a trial against it with `ringbook confirm`", store.ShortID(logged))
	}
	return &logged, nil
}
