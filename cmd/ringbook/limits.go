package main

import (
	"ringbook/recipes"
	"ringbook/snubber"
	"ringbook/snubber/preferred"
	"ringbook/snubber/quantity"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

// limitsFlags are the flags that say what a network is to keep, and what it may be made of.
type limitsFlags struct {
	maxPeak                        quantity.Volt
	derate, minDamping, cTol, rTol quantity.Fraction
	maxLoss                        quantity.Watt
	hz                             quantity.Hertz
	cSeries, rSeries               preferred.Series
	network                        string
	cOnHand, rOnHand               []string
	settle                         quantity.Second
	band                           quantity.Fraction
	drop                           quantity.Volt
	diodeOhm                       quantity.Ohm
	ambient                        float64

	own []*pflag.Flag
}

func (l *limitsFlags) add(cmd *cobra.Command) {
	l.cSeries, l.rSeries, l.network = preferred.E12, preferred.E24, "rc"
	f := pflag.NewFlagSet("limits", pflag.ContinueOnError)
	f.Var(&l.maxPeak, "max-peak", "highest voltage allowed across the switch")
	f.Var(&l.derate, "derate", "share of the device's rating taken as the limit without --max-peak (80%)")
	f.Var(&l.minDamping, "min-damping", "least damping ratio of the ring")
	f.Var(&l.maxLoss, "max-loss", "most power the ring and the network may lose")
	f.Var(&l.hz, "switching-hz", "switching frequency, where the trials state none or another is meant")
	f.Var(&l.cTol, "c-tol", "tolerance of the capacitor to buy, such as 5%")
	f.Var(&l.rTol, "r-tol", "tolerance of the resistor to buy, such as 1%")
	f.Var(&l.cSeries, "c-series", "IEC 60063 series of the capacitor")
	f.Var(&l.rSeries, "r-series", "IEC 60063 series of the resistor")
	f.StringVar(&l.network, "network", l.network, "`KIND` to recommend: rc, c, rcd, or any of them")
	f.StringSliceVar(&l.cOnHand, "c-on-hand", nil, "choose among these `CAPACITORS` alone, such as 270p,330p")
	f.StringSliceVar(&l.rOnHand, "r-on-hand", nil, "choose among these `RESISTORS` alone, such as 4R7,10R")
	f.Var(&l.settle, "settle-s", "time from which the node must stay near the bus")
	f.Var(&l.band, "settle-band", "how near, as a share of the bus (5%)")
	f.Var(&l.drop, "diode-drop", "forward drop of the diode of an rcd network (0.8V)")
	f.Var(&l.diodeOhm, "diode-ohm", "its on-resistance (100m)")
	f.Float64Var(&l.ambient, "ambient-c", 25, "temperature where the resistor is, degrees Celsius")
	f.VisitAll(func(one *pflag.Flag) { l.own = append(l.own, one) })
	cmd.Flags().AddFlagSet(f)
	completes(cmd, "network", "rc", "c", "rcd", "any")
}

// given is the first of these flags on the command line; "" where there is none.
func (l *limitsFlags) given() string {
	for _, f := range l.own {
		if f.Changed {
			return "--" + f.Name
		}
	}
	return ""
}

// read gives what is asked for as the flags have it.
func (l *limitsFlags) read() (recipes.Request, error) {
	kinds, ok := map[string][]snubber.Kind{"rc": {snubber.RC}, "c": {snubber.C}, "rcd": {snubber.RCD}, "any": {snubber.C, snubber.RC, snubber.RCD}}[l.network]
	if !ok {
		return recipes.Request{}, usagef("--network %q: it must be one of rc, c, rcd, any", l.network)
	}
	cs, err := partsOnHand("c-on-hand", l.cOnHand, func() flagValue { return new(quantity.Farad) })
	if err != nil {
		return recipes.Request{}, err
	}
	rs, err := partsOnHand("r-on-hand", l.rOnHand, func() flagValue { return new(quantity.Ohm) })
	if err != nil {
		return recipes.Request{}, err
	}
	for _, tol := range []struct {
		flag  string
		value quantity.Fraction
	}{{"c-tol", l.cTol}, {"r-tol", l.rTol}} {
		if tol.value >= 1 {
			return recipes.Request{}, usagef("--%s %v: a part of that tolerance may be nothing at all; write for example 5%%", tol.flag, tol.value)
		}
	}
	return recipes.Request{
		Limits: snubber.Limits{
			MaxPeak: float64(l.maxPeak), MinDamping: float64(l.minDamping), MaxLoss: float64(l.maxLoss),
			SwitchingHz: float64(l.hz), CSeries: l.cSeries, RSeries: l.rSeries, CTol: float64(l.cTol), RTol: float64(l.rTol),
			Kinds: kinds, OnHandC: cs, OnHandR: rs, SettleS: float64(l.settle), SettleBand: float64(l.band),
			DiodeDrop: float64(l.drop), DiodeOhm: float64(l.diodeOhm), AmbientC: l.ambient,
		},
		Derate: float64(l.derate),
	}, nil
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
