package recipes

import (
	"context"

	"ringbook/recipes/page"
	"ringbook/snubber/quantity"
)

// Boards is the page of what is under test: each board with its revisions.
func Boards(ctx context.Context, p *page.Page, src Source) error {
	// Trials that were struck are not counted.
	boards, err := src.Logbook.Boards(ctx)
	if err != nil {
		return err
	}
	if len(boards) == 0 {
		p.Say("No board is on file. `ringbook board add` puts one there; logging a trial does too.")
		return nil
	}
	t := page.NewTable("Boards",
		page.Label("board", "board"),
		page.Label("revision", "revision"),
		page.Number("device rating", quantity.Voltage, "rating_v"),
		page.Number("trials", quantity.Ratio, "trials"),
		page.Words("note", "note"),
	)
	for _, b := range boards {
		if len(b.Revisions) == 0 {
			t.Row(b.Name, "", orNone(b.DeviceV), 0, b.Note)
		}
		for _, r := range b.Revisions {
			note := b.Note
			if r.Note != "" {
				note = r.Note
			}
			t.Row(b.Name, r.Name, orNone(b.DeviceV), r.Trials, note)
		}
	}
	p.Table(t)
	return nil
}
