package page_test

import (
	"fmt"
	"os"
	"time"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// A recipe is a function like this one: results in, page out.
func loopRecipe(p *page.Page, trials []snubber.Trial, l, c snubber.Estimate) {
	p.Say("The line through **%d trials** gives the loop of the board alone, without the probe.", len(trials))
	p.Figures(
		page.Figure{Name: "loop inductance", Unit: quantity.Inductance, CSV: "inductance_h", Value: l},
		page.Figure{Name: "node capacitance", Unit: quantity.Capacitance, CSV: "capacitance_f", Value: c,
			Remark: "the probe's 8 pF taken off"},
		page.Figure{Name: "loop resistance", Unit: quantity.Resistance, CSV: "resistance_ohm",
			Remark: "no decay was read"},
	)
	t := page.NewTable("Trials",
		page.Instant("read", "at"),
		page.Label("network", "network"),
		page.Part("C", quantity.Capacitance, "c"),
		page.Measured("ring", quantity.Frequency, "ring_hz"),
		page.Number("peak", quantity.Voltage, "peak_v"),
	)
	for _, trial := range trials {
		var fitted, ring, peak any // nil where nothing is fitted, nothing was read
		if trial.Network.Kind.HasC() {
			fitted = trial.Network.C
		}
		if r, ok := trial.Reading(snubber.RingHz); ok {
			ring = r
		}
		if r, ok := trial.Reading(snubber.PeakV); ok {
			peak = r
		}
		row := t.Row(trial.At, string(trial.Network.Kind), fitted, ring, peak)
		if peak == nil {
			row.Note("The peak was not read; read it at the switch's own pins.")
		}
	}
	p.Table(t)
	p.Warn("The loop resistance is unknown: read `decay_s` of one trial.")
}

func Example() {
	day := time.Date(2031, 3, 14, 9, 30, 0, 0, time.UTC)
	read := func(ring, peak float64) []snubber.Reading {
		rs := []snubber.Reading{{Quantity: snubber.RingHz, Value: ring, U: ring * 1.5e-3}}
		if peak > 0 {
			rs = append(rs, snubber.Reading{Quantity: snubber.PeakV, Value: peak, U: 0.5})
		}
		return rs
	}
	trials := []snubber.Trial{
		{At: day, Network: snubber.Network{Kind: snubber.Bare}, Readings: read(41.2e6, 87.5)},
		{At: day.Add(4 * time.Minute), Network: snubber.Network{Kind: snubber.C, C: 470e-12}, Readings: read(28.31e6, 92)},
		{At: day.Add(9 * time.Minute), Network: snubber.Network{Kind: snubber.C, C: 2.2e-9}, Readings: read(16.44e6, 0)},
	}
	p := page.New("Loop of winch-drive B")
	loopRecipe(p, trials,
		snubber.Estimate{Value: 36.2e-9, U: 0.41e-9, Low: 35.4e-9, High: 37e-9},
		snubber.Estimate{Value: 405e-12, U: 7.3e-12, Low: 390.7e-12, High: 419.3e-12})
	if err := p.Text(os.Stdout, page.TextOptions{Width: 72}); err != nil {
		fmt.Println(err)
	}
	// Output:
	// Loop of winch-drive B
	// ═════════════════════
	//
	// The line through 3 trials gives the loop of the board alone, without the
	// probe.
	//
	// Quantity                  Value  95 % interval         Remark
	// ────────────────────────────────────────────────────────────────────────
	// loop inductance    36.20(41) nH  35.40 nH to 37.00 nH
	// node capacitance  405.0(73) pF   390.7 pF to 419.3 pF  the probe's 8 pF
	//                                                        taken off
	// loop resistance     –                                  no decay was read
	//
	// Trials
	//
	// read (UTC)        network     C  ring / MHz  peak / V
	// ────────────────────────────────────────────────────────
	// 2031-03-14 09:30  bare        –  41.200(62)      87.5
	// 2031-03-14 09:34  c        470p  28.310(42)      92.0
	// 2031-03-14 09:39  c         2n2  16.440(25)       –    a
	//
	// a  The peak was not read; read it at the switch's own pins.
	//
	// Warning: The loop resistance is unknown: read decay_s of one trial.
}
