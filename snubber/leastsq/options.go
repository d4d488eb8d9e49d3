package leastsq

import "fmt"

// Options steers Fit. The zero value is a good choice.
type Options struct {
	// MaxIterations is the largest number of Jacobians the iteration may take, > 0. 0 means 1000.
	MaxIterations int

	// Offset is the relative offset at which the fit has converged, dimensionless, from 1e-14 to 0.1: the length of the
	// residuals' projection on the model's tangent plane over the length of the residuals. At 1e-3
	// the parameters are a thousandth of their uncertainty (times sqrt(dof)) from the minimum.
	// 0 means 1e-9.
	Offset float64

	// Step is the relative size of a full Gauss-Newton step, |D dq|/|D q|, at which the fit has converged,
	// dimensionless, from 1e-16 to 0.1; a parameter near zero counts by its typical size. It ends fits whose
	// residuals vanish. 0 means 1e-14.
	Step float64

	// Rank is the smallest singular value of the Jacobian, its columns scaled to length one, as a fraction of the
	// largest, at which a combination of parameters still counts as told by the readings;
	// dimensionless, from 1e-16 to 0.1. 0 means max(N, len(Start)) times 2.2e-16 with an analytic
	// Jacobian and 1e-9 with finite differences.
	Rank float64

	// Loss is a robust loss; nil means plain least squares.
	Loss Loss
}

func (o Options) fill(pr *Problem) (Options, error) {
	if o.MaxIterations < 0 {
		return o, fmt.Errorf("MaxIterations = %d: it must be positive, or 0 for 1000", o.MaxIterations)
	}
	if o.MaxIterations == 0 {
		o.MaxIterations = 1000
	}
	rank := 1e-9
	if pr.Jacobian != nil {
		rank = float64(max(pr.N, len(pr.Start))) * epsilon
	}
	for _, t := range []struct {
		name      string
		value     *float64
		low, zero float64
	}{
		{"Offset", &o.Offset, 1e-14, 1e-9},
		{"Step", &o.Step, 1e-16, 1e-14},
		{"Rank", &o.Rank, 1e-16, rank},
	} {
		if *t.value == 0 {
			*t.value = t.zero
		} else if !(*t.value >= t.low && *t.value <= 0.1) {
			return o, fmt.Errorf("%s = %g: it must lie from %g to 0.1, or be 0 for %g", t.name, *t.value, t.low, t.zero)
		}
	}
	return o, nil
}

// epsilon is the spacing of float64 above 1.
const epsilon = 0x1p-52
