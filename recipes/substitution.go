package recipes

import (
	"context"

	"ringbook/recipes/page"
	"ringbook/snubber"
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
	fit, err := snubber.Fit(ctx, trials)
	if err != nil {
		return err
	}
	p.Figures(loopFigures(fit)...)
	p.Say("%d trials; chi-square %.3g for %d degrees of freedom.", fit.Trials, fit.Chi2, fit.DOF)
	for _, s := range fit.SetAside {
		p.Warn("Trial %s was set aside: %s.", store.ShortID(s.Trial), s.Because)
	}
	for _, w := range fit.Warnings {
		p.Warn("%s.", w)
	}
	return nil
}
