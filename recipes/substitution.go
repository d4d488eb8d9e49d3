package recipes

import (
	"context"
	"fmt"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"
)

// Substitution is the page of a capacitor-substitution series: the trials, the line through them, the loop.
func Substitution(ctx context.Context, p *page.Page, src Source) error {
	// Every trial in scope, struck ones marked. Each known capacitor across the switch slows the ring by a known amount.
	trials, err := src.Trials(ctx)
	if err != nil {
		return err
	}
	p.Table(trialTable("Trials", trials))

	// The square of the period grows in a straight line with the capacitance: its slope is the loop's inductance, and
	// where it meets zero lies the loop's own capacitance.
	fit, err := src.Fit(ctx, trials)
	if err != nil {
		return err
	}
	p.Figures(loopFigures(fit)...)
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
	if s := fit.Suggestion; s != nil && !s.Enough {
		p.Say("Next, %s would tell most: it would shrink the uncertainty of Z0 by %.0f %%.", quantity.Code(s.C, quantity.Capacitance), 100*s.Gain)
	} else if s != nil {
		p.Say("That is enough: %s.", s.Because)
	}
	return nil
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
