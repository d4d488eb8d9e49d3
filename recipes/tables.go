package recipes

import (
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"
)

// reading is a table's cell of the trial's reading of q; nil where it was not read.
func reading(t snubber.Trial, q snubber.Quantity) any {
	if r, ok := t.Reading(q); ok {
		return r
	}
	return nil
}

// estimateOf is the same without what else a reading carries, for tables of very many.
func estimateOf(t snubber.Trial, q snubber.Quantity) any {
	if r, ok := t.Reading(q); ok {
		return snubber.Estimate{Value: r.Value, U: r.U}
	}
	return nil
}

// orNone is a cell of a value that is zero where there is none.
func orNone(v float64) any {
	if v == 0 {
		return nil
	}
	return v
}

// trialTable lists trials with what they fitted and read.
func trialTable(title string, trials []snubber.Trial) *page.Table {
	t := page.NewTable(title,
		page.Label("trial", "trial"),
		page.Label("network", "network"),
		page.Part("C", quantity.Capacitance, "c"),
		page.Part("R", quantity.Resistance, "r"),
		page.Measured("ring", quantity.Frequency, "ring_hz"),
		page.Measured("decay", quantity.Time, "decay_s"),
		page.Measured("peak", quantity.Voltage, "peak_v"),
		page.Number("bus", quantity.Voltage, "bus_v"),
	)
	for _, x := range trials {
		row := t.Row(store.ShortID(x.ID), string(x.Network.Kind), orNone(x.Network.C), orNone(x.Network.R),
			reading(x, snubber.RingHz), reading(x, snubber.DecayS), reading(x, snubber.PeakV), orNone(x.Operating().BusV))
		if x.Struck != "" {
			row.Note("struck: %s", x.Struck)
		}
		for _, r := range x.Readings {
			if r.FromWaveform {
				row.Note("ring, decay and peak were read from its captured samples")
				break
			}
		}
	}
	return t
}

// loopFigures are the key figures of a fit.
func loopFigures(f *snubber.FitResult) []page.Figure {
	cell := func(e *snubber.Estimate) any {
		if e == nil {
			return nil
		}
		return e
	}
	return []page.Figure{
		{Name: "loop inductance L", CSV: "inductance_h", Unit: quantity.Inductance, Value: cell(f.Loop.Inductance)},
		{Name: "loop capacitance C", CSV: "capacitance_f", Unit: quantity.Capacitance, Value: cell(f.Loop.Capacitance), Remark: "the board's own, without the probe"},
		{Name: "loop resistance r", CSV: "resistance_ohm", Unit: quantity.Resistance, Value: cell(f.Loop.Resistance), Remark: unlessRead(f.Loop.Resistance, "no decay was read")},
		{Name: "impedance Z0 = sqrt(L/C)", CSV: "impedance_ohm", Unit: quantity.Resistance, Value: cell(f.Loop.Impedance)},
		{Name: "ring frequency, undamped", CSV: "ring_hz", Unit: quantity.Frequency, Value: cell(f.Loop.RingHz)},
		{Name: "excitation I0", CSV: "excitation_a", Unit: quantity.Current, Value: cell(f.Excitation), Remark: unlessRead(f.Excitation, "no peak was read with its bus voltage")},
	}
}

func unlessRead(e *snubber.Estimate, remark string) string {
	if e != nil {
		return ""
	}
	return remark
}

// choiceRow adds one network to a table made by choiceTable.
func choiceRow(t *page.Table, what string, c *snubber.Choice) *page.Row {
	return t.Row(what, orNone(c.R), orNone(c.C), c.Peak.Value, c.WorstV, c.Damping.Value, c.LossW, c.ResistorW)
}

// choiceTable compares networks.
func choiceTable(title string) *page.Table {
	return page.NewTable(title,
		page.Label("network", "network"),
		page.Part("R", quantity.Resistance, "r_ohm"),
		page.Part("C", quantity.Capacitance, "c_f"),
		page.Number("peak", quantity.Voltage, "peak_v"),
		page.Number("at worst", quantity.Voltage, "worst_v"),
		page.Number("damping ratio", quantity.Ratio, "damping_ratio"),
		page.Number("loss", quantity.Power, "loss_w"),
		page.Number("in R", quantity.Power, "resistor_w"),
	)
}

// networksTable puts the choice beside the bare node, what costs more for a lower peak, and the rule of thumb.
func networksTable(rec *snubber.Recommendation) *page.Table {
	t := choiceTable("Networks compared")
	choiceRow(t, "bare", rec.Bare)
	if rec.Met {
		choiceRow(t, "recommended", rec.Choice)
	} else {
		choiceRow(t, "nearest miss", rec.Choice)
	}
	for i := range rec.Alternatives {
		choiceRow(t, "alternative", &rec.Alternatives[i])
	}
	choiceRow(t, "rule of thumb", rec.RuleOfThumb).Note("R next to Z0 and C three times the loop's: common practice")
	t.Note("at worst: what the worst corner of the parts' tolerances keeps on 99 %% of the loops that the trials allow")
	t.Note("loss is that of the ring and the network: in R, in the switch at turn-on, in the loop")
	return t
}
