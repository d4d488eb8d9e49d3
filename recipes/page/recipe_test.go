package page_test

import (
	_ "embed"
	"errors"
	"fmt"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

//go:embed recipe_test.go
var recipeSource string

// ladder is the page of a ladder of known capacitors on **winch-drive B**: every kind of prose and of result once.
//
// The loop's inductance follows from how far each capacitor slows the ring.
func ladder(p *page.Page, rings []float64) error {
	p.Weave(recipeSource)

	// # What was read
	//
	// Each known capacitor across the switch slows the ring by a *known* amount. Struck trials stay in the table, with
	// their reason; `nil` cells were not read.
	//
	//  1. discharge the node,
	//  2. fit the capacitor,
	//  3. read the ring:
	//     - its frequency,
	//     - its <b>peak</b>, and ![no](https://pictures.invalid/x.png).
	t := page.NewTable("Trials of the ladder",
		page.Label("trial", "trial"),
		page.Part("C", quantity.Capacitance, "c"),
		page.Measured("ring", quantity.Frequency, "ring_hz"),
		page.Number("bus", quantity.Voltage, "bus_v"),
		page.Words("note", "note"))
	for i, f := range rings {
		row := t.Row(fmt.Sprintf("T-%03d", i+1), 100e-12*float64(i+1),
			snubber.Reading{Value: f, U: f * 2e-3}, 48+0.5*float64(i), "")
		if i == 2 { // a comment inside a statement is code
			row.Note("The decay was not read: lengthen the record.")
		}
	}
	p.Table(t)
	if err := checkRings(rings); err != nil {
		return err
	}

	/*
		The period's square grows in a straight line with the capacitance:

		    T^2 = (2 pi)^2 L (C + Cadd)

		> Its slope is the loop's inductance.
	*/
	l := snubber.Estimate{Value: 36.2e-9, U: 0.41e-9, Low: 35.4e-9, High: 37e-9}
	p.Figures(page.Figure{Name: "loop inductance L", Unit: quantity.Inductance, CSV: "inductance_h", Value: l})
	footing := `raw text
	keeps its tab`
	for range 2 {
		conclude(p, footing) // by a helper, in a loop
	}

	// Nothing more is known of this loop.
	return nil
}

func checkRings(rings []float64) error {
	if len(rings) == 0 {
		return errors.New("no ring was read; take a trial")
	}
	return nil
}

func conclude(p *page.Page, s string) { p.Say("Concluded from %q.", s) }
