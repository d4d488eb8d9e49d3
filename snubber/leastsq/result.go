package leastsq

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// Result is what a fit found.
type Result struct {
	P           []float64 // the parameters, in the caller's units
	Residuals   []float64 // the whitened residuals at P
	Chi2        float64   // sum of Residuals^2; with a Loss, the sum of its rho
	Dof         int       // degrees of freedom: residuals less the combinations of parameters told
	Iterations  int       // Jacobians taken in the iteration
	Evaluations int       // calls of the residual function, those for finite differences among them

	Status Status
	Reason string // the status in a sentence

	// AtBound marks the parameters that lie on a bound as near as a float64 can tell: chi2 would fall further
	// beyond. Their uncertainty is that of the same model without the bound, and is to be read with that in mind.
	AtBound []bool

	// Undetermined marks the parameters of which the readings tell nothing: those that have a part in one of
	// Blind. Their variance is +Inf and their covariances are 0; those of the others are right.
	Undetermined []bool

	// Blind holds the directions in which the parameters can move together without moving a residual, each as a
	// change of the parameters, in their units, that moves no single column of the Jacobian by more than one unit
	// of length. Empty where the readings tell every parameter.
	Blind [][]float64

	// Condition is the condition number of the Jacobian with its columns scaled to length one; +Inf where it
	// has no full rank.
	Condition float64

	stated *mat.SymDense
}

// Scale says what the uncertainties of the parameters rest on.
type Scale int

const (
	// Stated takes the readings' stated uncertainties at their word. chi2 then tests the model.
	Stated Scale = iota
	// Scatter takes only the ratios of the stated uncertainties and judges their size by the readings' scatter about the
	// fit: the covariance times chi2/dof, which supposes that the model is right. With no degree
	// of freedom left the scatter tells nothing, and every variance is +Inf.
	Scatter
)

// Covariance gives the covariance of the parameters, len(P) by len(P), in products of the parameters' units;
// nil where the fit ended without a Jacobian. See Undetermined for the meaning of +Inf.
func (r *Result) Covariance(by Scale) *mat.SymDense {
	if r.stated == nil {
		return nil
	}
	f := r.factor(by)
	n := r.stated.SymmetricDim()
	c := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			v := r.stated.At(i, j)
			switch {
			case math.IsInf(f, 1) && i == j:
				v = f
			case math.IsInf(f, 1):
				v = 0
			case !math.IsInf(v, 1):
				v *= f
			}
			c.SetSym(i, j, v)
		}
	}
	return c
}

func (r *Result) factor(by Scale) float64 {
	switch {
	case by == Stated:
		return 1
	case r.Dof == 0:
		return math.Inf(1)
	}
	return r.Chi2 / float64(r.Dof)
}

// StdErr gives the standard uncertainties of the parameters, in their units; nil where the fit ended without a
// Jacobian.
func (r *Result) StdErr(by Scale) []float64 {
	if r.stated == nil {
		return nil
	}
	f := r.factor(by)
	u := make([]float64, r.stated.SymmetricDim())
	for j := range u {
		u[j] = math.Sqrt(r.stated.At(j, j))
		if !math.IsInf(u[j], 1) && !math.IsInf(f, 1) {
			u[j] *= math.Sqrt(f)
		} else {
			u[j] = math.Inf(1)
		}
	}
	return u
}

// Correlation gives the correlation coefficients of the parameters: 1 on the diagonal, 0 between an
// undetermined parameter and any other. nil where the fit ended without a Jacobian.
func (r *Result) Correlation() *mat.SymDense {
	if r.stated == nil {
		return nil
	}
	n := r.stated.SymmetricDim()
	c := mat.NewSymDense(n, nil)
	for i := range n {
		c.SetSym(i, i, 1)
		for j := i + 1; j < n; j++ {
			vi, vj := r.stated.At(i, i), r.stated.At(j, j)
			if vi > 0 && vj > 0 && !math.IsInf(vi, 1) && !math.IsInf(vj, 1) {
				c.SetSym(i, j, r.stated.At(i, j)/math.Sqrt(vi)/math.Sqrt(vj))
			}
		}
	}
	return c
}
