package leastsq

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Problem is what Fit minimises: the sum over i of r_i(p)^2, r the whitened residuals.
type Problem struct {
	// N is the number of residuals; at least as many as parameters.
	N int

	// Start holds the parameters to start from, strictly inside their bounds.
	Start []float64

	// Residuals writes the N whitened residuals at p into dst: (model - reading)/u, u the reading's standard
	// uncertainty. A NaN or an infinity says that the model has no value at p; the iteration then steps back.
	// It must not keep or change p.
	Residuals func(dst, p []float64)

	// Jacobian writes d r_i / d p_j into dst (N by len(Start), every element), in the caller's own
	// parameters whatever their bounds. nil: finite differences.
	Jacobian func(dst *mat.Dense, p []float64)

	// Bounds holds one bound for each parameter; nil: none is bounded.
	Bounds []Bound

	// Typical holds the size of a change in each parameter that matters, > 0, in the parameter's unit. It sets the
	// step of finite differences where the parameter is near zero. nil, or 0 for one parameter: a hundredth
	// of |Start|, or 1 where Start is 0.
	Typical []float64

	// Names holds the parameters' names for messages; nil: p0, p1, ...
	Names []string
}

// Curve makes the Problem of a model fitted to readings y of standard uncertainties u (> 0; nil: all 1).
// model writes the len(y) values of the model at p into dst; jac, if not nil, its derivatives d model_i / d p_j
// (len(y) by len(start)). start holds the parameters to start from.
//
// With u nil the readings' scatter is not known beforehand: take the uncertainties by Scatter.
func Curve(model func(dst, p []float64), jac func(dst *mat.Dense, p []float64), y, u, start []float64) (Problem, error) {
	if model == nil {
		return Problem{}, fmt.Errorf("fit a curve: no model function")
	}
	w, err := reciprocals(y, u)
	if err != nil {
		return Problem{}, fmt.Errorf("fit a curve: %w", err)
	}
	pr := Problem{N: len(y), Start: start}
	pr.Residuals = func(dst, p []float64) {
		model(dst, p)
		for i := range dst {
			dst[i] = (dst[i] - y[i]) * w[i]
		}
	}
	if jac != nil {
		pr.Jacobian = func(dst *mat.Dense, p []float64) {
			jac(dst, p)
			for i, wi := range w {
				row := dst.RawRowView(i)
				for j := range row {
					row[j] *= wi
				}
			}
		}
	}
	return pr, nil
}

// reciprocals gives 1/u for readings y, and checks both.
func reciprocals(y, u []float64) ([]float64, error) {
	if u != nil && len(u) != len(y) {
		return nil, fmt.Errorf("%d readings but %d uncertainties: give one for each, or none at all", len(y), len(u))
	}
	w := make([]float64, len(y))
	for i := range y {
		w[i] = 1
		if u != nil {
			w[i] = 1 / u[i]
			if !(u[i] > 0) || math.IsInf(u[i], 0) || math.IsInf(w[i], 0) {
				return nil, fmt.Errorf("reading %d has the uncertainty %g: it must be a positive, finite number", i, u[i])
			}
		}
		if !finite(y[i]) {
			return nil, fmt.Errorf("reading %d is %g: leave it out or give a number", i, y[i])
		}
	}
	return w, nil
}

func (pr *Problem) check() error {
	n := len(pr.Start)
	switch {
	case pr.Residuals == nil:
		return fmt.Errorf("no residual function")
	case n == 0:
		return fmt.Errorf("no parameter to fit: Start is empty")
	case pr.N < n:
		return fmt.Errorf("%d residuals cannot tell %d parameters: take more readings or fix a parameter", pr.N, n)
	case pr.Bounds != nil && len(pr.Bounds) != n:
		return fmt.Errorf("%d bounds for %d parameters: give one for each, or none at all", len(pr.Bounds), n)
	case pr.Typical != nil && len(pr.Typical) != n:
		return fmt.Errorf("%d typical sizes for %d parameters: give one for each, or none at all", len(pr.Typical), n)
	case pr.Names != nil && len(pr.Names) != n:
		return fmt.Errorf("%d names for %d parameters: give one for each, or none at all", len(pr.Names), n)
	}
	for j, s := range pr.Start {
		if !finite(s) {
			return fmt.Errorf("parameter %s starts at %g: start from a finite number", pr.name(j), s)
		}
		if pr.Typical != nil && !(pr.Typical[j] >= 0 && finite(pr.Typical[j])) {
			return fmt.Errorf("parameter %s has the typical size %g: it must be positive, or 0 for a hundredth of |Start|", pr.name(j), pr.Typical[j])
		}
		if pr.Bounds != nil {
			if err := pr.Bounds[j].check(s); err != nil {
				return fmt.Errorf("parameter %s: %w", pr.name(j), err)
			}
		}
	}
	return nil
}

func (pr *Problem) name(j int) string {
	if pr.Names != nil {
		return pr.Names[j]
	}
	return fmt.Sprintf("p%d", j)
}

func (pr *Problem) bound(j int) Bound {
	if pr.Bounds == nil {
		return Bound{}
	}
	return pr.Bounds[j]
}

// typical gives the size of a change in parameter j that matters.
func (pr *Problem) typical(j int) float64 {
	switch {
	case pr.Typical != nil && pr.Typical[j] > 0:
		return pr.Typical[j]
	case pr.Start[j] != 0:
		return math.Abs(pr.Start[j]) / 100
	}
	return 1
}

func finite(x float64) bool { return x-x == 0 }
