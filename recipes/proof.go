package recipes

import (
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// Proof puts a prediction beside what was then measured.
func Proof(p *page.Page, c *snubber.Confirmation) {
	p.Figures(
		page.Figure{Name: "peak predicted", CSV: "predicted_v", Unit: quantity.Voltage, Value: c.Predicted},
		page.Figure{Name: "peak measured", CSV: "measured_v", Unit: quantity.Voltage, Value: c.Measured},
		page.Figure{Name: "limit", CSV: "limit_v", Unit: quantity.Voltage, Value: c.LimitV},
	)
	switch {
	case c.Agrees && c.Keeps:
		p.Say("The peak measured agrees with the prediction and stays under the limit.")
	case c.Agrees:
		p.Say("The peak measured agrees with the prediction and **exceeds the limit**.")
	case c.Keeps:
		p.Say("The peak measured stays under the limit but **does not agree** with the prediction: the loop is not what the trials said, or a part is not what it says. Take the series again.")
	default:
		p.Say("The peak measured **exceeds the limit** and **does not agree** with the prediction: the loop is not what the trials said, or a part is not what it says. Take the series again.")
	}
}
