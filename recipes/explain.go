package recipes

import (
	"fmt"
	"strings"

	"ringbook/snubber/quantity"
)

// explain says what would account for a peak measured off the prediction; "" where nothing would alone.
func (c *Confirmation) explain() string {
	var causes []string
	for _, x := range []struct {
		what     string
		was, now float64
		unit     quantity.Unit
	}{
		{"a loop current at turn-off", c.decision.Excitation.Current, c.CurrentA, quantity.Current},
		{"a loop inductance", c.decision.Loop.Inductance, c.InductanceH, quantity.Inductance},
	} {
		if x.now > 0 {
			causes = append(causes, fmt.Sprintf("%s of %s instead of %s", x.what, quantity.Format(x.now, x.unit, 2), quantity.Format(x.was, x.unit, 2)))
		}
	}
	if len(causes) == 0 {
		return ""
	}
	return upper(strings.Join(causes, ", or ")) + " would explain it"
}

// upper begins a sentence.
func upper(s string) string { return strings.ToUpper(s[:1]) + s[1:] }
