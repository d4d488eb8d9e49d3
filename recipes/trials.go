package recipes

import (
	"context"

	"ringbook/recipes/page"
	"ringbook/snubber"
)

// Trials is the page of the trials themselves.
func Trials(ctx context.Context, p *page.Page, src Source) error {
	trials, err := src.Trials(ctx)
	if err != nil {
		return err
	}
	p.Table(trialTable("Trials", trials))
	return nil
}

// OneTrial puts one trial on a page.
func OneTrial(p *page.Page, t snubber.Trial) {
	p.Table(trialTable("Logged", []snubber.Trial{t}))
}
