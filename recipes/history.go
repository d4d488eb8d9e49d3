package recipes

import (
	"context"
	_ "embed"

	"ringbook/recipes/page"
	"ringbook/snubber/quantity"

	"ringbook/snubber"
	"ringbook/store"
)

//go:embed history.go
var historySource string

// History is the page of the logbook itself: every trial in scope, the latest last.
func History(ctx context.Context, p *page.Page, src Source) error {
	p.Weave(historySource)

	// The rows come in the order they were read. A trial is never changed or deleted: one that was wrong is struck, and
	// stays with its reason.
	t := page.NewTable("Trials "+src.order(),
		page.Label("trial", "id"),
		page.Instant("at", "at"),
		page.Label("board", "board"),
		page.Label("rev", "revision"),
		page.Label("network", "network"),
		page.Part("C", quantity.Capacitance, "c"),
		page.Part("R", quantity.Resistance, "r"),
		page.Measured("ring", quantity.Frequency, "ring_hz"),
		page.Measured("peak", quantity.Voltage, "peak_v"),
		page.Words("note", "note"),
	)
	n := 0
	for x, err := range src.Each(ctx) {
		if err != nil {
			return err
		}
		n++
		row := t.Row(store.ShortID(x.ID), x.At.UTC(), x.Board, x.Revision, string(x.Network.Kind), orNone(x.Network.C), orNone(x.Network.R),
			estimateOf(x, snubber.RingHz), estimateOf(x, snubber.PeakV), x.Note)
		if x.Struck != "" {
			row.Note("struck: %s", x.Struck)
		}
	}
	if n == 0 {
		p.Say("No trial is in scope. `ringbook trial take` and `ringbook trial enter` log one, `ringbook trial import` many.")
		return nil
	}
	p.Table(t)
	return nil
}
