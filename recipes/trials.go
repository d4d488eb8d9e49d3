package recipes

import (
	"context"

	"ringbook/recipes/page"
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
