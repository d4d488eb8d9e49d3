package page_test

import (
	_ "embed"
	"fmt"
	"os"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

//go:embed substitution_example_test.go
var substitutionSource string

// Two rings, one with a known capacitor across the switch, give the inductance and the capacitance of the loop.
func substitution(p *page.Page, bare, slowed snubber.Reading, c float64) error {
	p.Weave(substitutionSource)

	// The node was read **bare**, and again with a capacitor that is known.
	t := page.NewTable("Trials",
		page.Part("C", quantity.Capacitance, "c"),
		page.Measured("ring", quantity.Frequency, "ring_hz"))
	t.Row(nil, bare)
	t.Row(c, slowed)
	p.Table(t)

	// A capacitor in parallel lowers the frequency as the square root of the capacitance, so the ratio of the two
	// squared tells what was there before.
	ratio := bare.Value / slowed.Value
	if ratio <= 1 {
		return fmt.Errorf("the capacitor did not slow the ring (%g Hz to %g Hz); read both again", bare.Value, slowed.Value)
	}
	p.Say("The loop alone has %s.", quantity.Format(c/(ratio*ratio-1), quantity.Capacitance, 2))
	return nil
}

// A recipe is an ordinary function in a file that embeds itself. Its comments are the page's prose, its statements the
// code, and each result stands after the statement that made it. Other outputs are HTML, Markdown, LaTeX and CSV.
func Example_recipe() {
	p := page.New("Substitution on winch-drive B")
	err := p.Run(func() error {
		return substitution(p, snubber.Reading{Value: 41.2e6, U: 62e3}, snubber.Reading{Value: 28.3e6, U: 42e3}, 470e-12)
	})
	p.Foot(page.Foot{Scope: "winch-drive B, 2 trials", Version: "ringbook"})
	if err != nil {
		fmt.Println(err) // it is on the page too
	}
	if err := p.Text(os.Stdout, page.TextOptions{Prose: true}); err != nil {
		fmt.Println(err)
	}
	// Output:
	// Substitution on winch-drive B
	// ═════════════════════════════
	//
	// Two rings, one with a known capacitor across the switch, give the inductance and
	// the capacitance of the loop.
	//
	// The node was read bare, and again with a capacitor that is known.
	//
	// Trials
	//
	//    C  ring / MHz
	// ────────────────
	//    –  41.200(62)
	// 470p  28.300(42)
	//
	// A capacitor in parallel lowers the frequency as the square root of the
	// capacitance, so the ratio of the two squared tells what was there before.
	//
	// The loop alone has 420 pF.
	//
	// Scope: winch-drive B, 2 trials
	// Made by: ringbook
}
