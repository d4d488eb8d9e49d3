package snubber

import "math"

// Estimate is a quantity as the fit or the recommendation knows it. A nil *Estimate is a quantity the
// trials cannot tell; it is null in JSON.
type Estimate struct {
	Value float64 `json:"value"`
	U     float64 `json:"u"`    // standard uncertainty (k = 1), unit of Value
	Low   float64 `json:"low"`  // lower end of the 95 % interval
	High  float64 `json:"high"` // upper end of the 95 % interval

	// DOF is the effective degrees of freedom behind U, where the scatter of few repeats is part of it (GUM G.4); 0: so
	// many that they do not matter.
	DOF float64 `json:"dof,omitempty"`
}

// normal95 is the half-width of a normal distribution's 95 % interval in standard deviations.
const normal95 = 1.959963984540054

// estimate is a value with its standard uncertainty and the interval of coverage factor k around it.
func estimate(value, u, k float64) *Estimate {
	return &Estimate{Value: value, U: u, Low: value - k*u, High: value + k*u}
}

// allow widens the estimate of a positive quantity by one more independent component of its uncertainty, relative (GUM
// 5.1.2), keeping its coverage factor.
func (e *Estimate) allow(rel float64) {
	f := math.Hypot(e.U, rel*e.Value) / math.Max(e.U, 1e-300)
	e.Low = e.Value * math.Pow(e.Low/e.Value, f)
	e.High = e.Value * math.Pow(e.High/e.Value, f)
	e.U *= f
}
