package main

import (
	"fmt"
	"math"
	"strings"

	"ringbook/acquire"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"
)

// rowForm is a row of the table that grows as a series goes on, 80 columns wide.
const rowForm = "%3s  %-13s %-15s %-12s %-11s %-9s %s\n"

// logged shows a trial as a row of the table, and below it what all trials now say.
func (v *seriesView) logged(e acquire.Logged) {
	v.newline()
	if v.app.quiet {
		return
	}
	if v.rows%12 == 0 { // half a small screen
		fmt.Fprintf(v.app.stderr, rowForm, "", "fitted", "ring", "decay", "peak", "supply", "trial")
	}
	v.rows++
	v.count = fmt.Sprintf("[%d read", e.Read)
	if e.Left >= 0 {
		v.count += fmt.Sprintf(", %d left", e.Left)
	}
	v.count += "] "
	t := e.Trial
	v.rememberBare(t)
	fitted := describe(t.Network)
	if t.Part != "" {
		fitted += " " + t.Part
	}
	fmt.Fprintf(v.app.stderr, rowForm, fmt.Sprint(e.Read), cut(fitted, 13), cell(t, snubber.RingHz, quantity.Frequency),
		cell(t, snubber.DecayS, quantity.Time), cell(t, snubber.PeakV, quantity.Voltage), v.supply(t), store.ShortID(t.ID))
	for _, w := range e.Warnings {
		if !v.noticed[w] {
			v.remark("Warning: " + w + ".")
		}
	}
	clear(v.noticed)
	v.state(e)
}

// state shows the fit.
func (v *seriesView) state(e acquire.Logged) {
	f := e.Fit
	if f == nil {
		if e.Read > 1 {
			v.remark("No loop yet: " + e.FitErr.Error() + ".")
		}
		return
	}
	var all []string
	for _, x := range []struct {
		name string
		e    *snubber.Estimate
		unit quantity.Unit
	}{{"L", f.Loop.Inductance, quantity.Inductance}, {"C", f.Loop.Capacitance, quantity.Capacitance}, {"Z0", f.Loop.Impedance, quantity.Resistance}} {
		if x.e != nil {
			factor, prefix := quantity.Scale(x.e.Value)
			half := (x.e.High - x.e.Low) / 2 * factor
			places := max(0, 1-int(math.Floor(math.Log10(half)))) // two digits of it
			all = append(all, fmt.Sprintf("%s %.*f ± %.*f %s%s", x.name, places, x.e.Value*factor, places, half, prefix, x.unit.Symbol()))
		}
	}
	v.app.progress("     %s  (95 %%)", strings.Join(all, "  "))
	for _, a := range f.SetAside {
		if a.Trial != e.Trial.ID { // of which the next question is
			v.remark("Set aside: trial " + store.ShortID(a.Trial) + ": " + a.Because + ".")
		}
	}
}

func cell(t snubber.Trial, q snubber.Quantity, unit quantity.Unit) string {
	r, ok := t.Reading(q)
	if !ok {
		return "-"
	}
	return quantity.FormatUncertain(r.Value, r.U, unit)
}

// rememberBare keeps the supply's power with the node bare.
func (v *seriesView) rememberBare(t snubber.Trial) {
	if w, ok := supplyW(t); ok && t.Network.Kind == snubber.Bare && t.Struck == "" {
		v.bare = w
	}
}

// supply is the supply's power, or by how much it is more than with the node bare.
func (v *seriesView) supply(t snubber.Trial) string {
	w, ok := supplyW(t)
	switch {
	case !ok:
		return "-"
	case t.Network.Kind == snubber.Bare || v.bare == 0:
		return quantity.Format(w, quantity.Power, 4)
	}
	return fmt.Sprintf("%+.2f W", w-v.bare)
}

func supplyW(t snubber.Trial) (float64, bool) {
	amps, ok := t.Reading(snubber.SupplyA)
	bus := t.Operating().BusV
	return amps.Value * bus, ok && bus > 0
}

func cut(s string, n int) string {
	if r := []rune(s); len(r) > n {
		return string(r[:n-1]) + "…"
	}
	return s
}
