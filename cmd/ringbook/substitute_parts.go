package main

import (
	"ringbook/acquire"
	"ringbook/snubber"
	"ringbook/snubber/preferred"
)

// A node's capacitance is not known before a capacitor was fitted; those of the trade's switches lie in this range, more or
// less (common practice).
const (
	smallestFirst = 100e-12 // F
	largestFirst  = 2.2e-9  // F
)

// usual is what a bench has where nobody lists it: the E6 series around the node's own capacitance.
func (s *substituteFlags) usual(fit *snubber.FitResult) []acquire.Part {
	low, high := smallestFirst, largestFirst
	if fit != nil {
		low, high = 0.3*fit.Loop.Capacitance.Value, 12*fit.Loop.Capacitance.Value
	}
	values, err := preferred.E6.Between(low, high)
	if err != nil {
		return nil // a node of no size that a part has
	}
	var parts []acquire.Part
	for _, v := range values {
		parts = append(parts, acquire.Part{Value: v, Tol: float64(s.tol)})
	}
	return parts
}
