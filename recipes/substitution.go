package recipes

import (
	"context"
	_ "embed"
	"fmt"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"
)

//go:embed substitution.go
var substitutionSource string

// Substitution is the page of a capacitor-substitution series. A known capacitor across the switch slows the ring by a
// known amount, and so tells the inductance and the capacitance of the loop that rings.
func Substitution(ctx context.Context, p *page.Page, src Source) error {
	p.Weave(substitutionSource)

	// ## The trials
	//
	// Every trial in scope. The ring's frequency is as seen, damped; decay is the 1/e time of its envelope.
	trials, err := src.Trials(ctx)
	if err != nil {
		return err
	}
	p.Table(trialTable("Trials", trials))

	// ## The loop
	//
	// All readings of all trials are fitted at once by least squares, with the error of each part, within its tolerance,
	// among the unknowns. A trial that the others contradict is set aside and said so.
	fit, err := src.Fit(ctx, trials)
	if err != nil {
		return err
	}
	p.Figures(loopFigures(fit)...)
	sayFit(p, fit)

	// ## The line
	//
	// The square of the ring's period grows in a straight line with the capacitance:
	// 1/(2πf)² = L (C + Cadd), with f corrected for its damping. It is the picture of the fit, from the frequencies
	// alone.
	if fit.Line != nil {
		p.Plot(linePlot(fit.Line))
	}

	// ## What to fit next
	sayNext(p, fit)
	return nil
}

// sayFit says how well the fit describes the trials, and what spoils it.
func sayFit(p *page.Page, fit *snubber.FitResult) {
	p.Say("%s; chi-square %.3g for %s of freedom.", count(fit.Trials, "trial"), fit.Chi2, count(fit.DOF, "degree"))
	for _, x := range fit.Effects {
		p.Say("The trials demand %s: %s.", x.Name, effectSize(x))
	}
	for _, s := range fit.SetAside {
		p.Warn("Trial %s was set aside: %s.", store.ShortID(s.Trial), s.Because)
	}
	for _, w := range fit.Warnings {
		p.Warn("%s.", w)
	}
}

// sayNext says which capacitor would tell most.
func sayNext(p *page.Page, fit *snubber.FitResult) {
	if s := fit.Suggestion; s != nil && !s.Enough {
		p.Say("Next, %s would tell most: it would shrink the uncertainty of Z0 by %.0f %%.", quantity.Code(s.C, quantity.Capacitance), 100*s.Gain)
	} else if s != nil {
		p.Say("That is enough: %s.", s.Because)
	}
}

// effectSize is an effect's size with its uncertainty.
func effectSize(x snubber.Effect) string {
	switch x.Unit {
	case "s":
		return quantity.FormatUncertain(x.Size.Value, x.Size.U, quantity.Time)
	case "H":
		return quantity.FormatUncertain(x.Size.Value, x.Size.U, quantity.Inductance)
	}
	return "a share of " + quantity.FormatUncertain(x.Size.Value, x.Size.U, quantity.Ratio)
}

// count is a number of things in words.
func count(n int, name string) string {
	if n == 1 {
		return "1 " + name
	}
	return fmt.Sprintf("%d %ss", n, name)
}
