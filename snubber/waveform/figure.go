package waveform

import "math"

// Figure is a value with its standard uncertainty (k = 1) and its 95 % interval, in the unit of what it is of.
type Figure struct {
	Value float64 `json:"value"`
	U     float64 `json:"u"`
	Low   float64 `json:"low"`
	High  float64 `json:"high"`
}

// figure is a value whose error is of the normal kind, u known from dof degrees of freedom.
func figure(value, u float64, dof int) *Figure {
	half := coverage(dof) * u
	f := &Figure{Value: value, U: u, Low: value - half, High: value + half}
	if !f.finite() {
		return nil
	}
	return f
}

func (f *Figure) finite() bool {
	s := math.Abs(f.Value) + f.U + math.Abs(f.Low) + math.Abs(f.High)
	return !math.IsNaN(s) && !math.IsInf(s, 0)
}

// coverage is Student's t for 95 %, two-sided, by its expansion in 1/dof (Abramowitz and Stegun, Handbook of Mathematical
// Functions, 26.7.5, from memory).
func coverage(dof int) float64 {
	const z = 1.959963984540054
	n := float64(max(dof, 3))
	return z + (z*z*z+z)/(4*n) + (5*math.Pow(z, 5)+16*z*z*z+3*z)/(96*n*n) +
		(3*math.Pow(z, 7)+19*math.Pow(z, 5)+17*z*z*z-15*z)/(384*n*n*n)
}
