package recipes

import (
	"context"

	"ringbook/recipes/page"
)

// Recipe is a page of the lab notebook that can be asked for by name.
type Recipe struct {
	Name   string // what it is asked for by
	Short  string // what it shows, in a line
	Title  string // of its page; the board revision follows: "Loop" gives "Loop of winch-drive B"
	Single bool   // it is of one board revision; false: of all in scope
	Struck bool   // trials marked as wrong are in its scope too
	Limits bool   // it keeps Source.Limits
	Weave  func(ctx context.Context, p *page.Page, src Source) error
}

// All are the recipes that `ringbook page` offers.
func All() []Recipe {
	return []Recipe{
		{
			Name: "substitution", Short: "the trials of a capacitor-substitution series, the line through them, the loop",
			Title: "Loop", Single: true, Weave: Substitution,
		},
		{
			Name: "choice", Short: "the network recommended, its ratings and losses, what else would do",
			Title: "Network", Single: true, Limits: true, Weave: Choice,
		},
		{
			Name: "proof", Short: "what was predicted against what was then measured",
			Title: "Prediction and measurement", Single: true, Weave: Proof,
		},
		{
			Name: "revisions", Short: "the revisions of a board side by side, with the differences and how sure they are",
			Title: "Revisions", Weave: Revisions,
		},
		{
			Name: "watts", Short: "what the supply gave with each network, against what was computed",
			Title: "Power", Single: true, Weave: Watts,
		},
		{
			Name: "history", Short: "every trial in scope, struck ones with their reason",
			Title: "History", Struck: true, Weave: History,
		},
	}
}
