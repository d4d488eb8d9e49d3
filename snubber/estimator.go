package snubber

import (
	"math"

	"ringbook/snubber/leastsq"

	"gonum.org/v1/gonum/mat"
)

// estimator turns derivatives by the fit's shared parameters into estimates with their 95 % intervals.
type estimator struct {
	fit     *leastsq.PartitionedResult
	obs     *observations
	widen   float64 // the factor by which the stated uncertainties are widened
	student float64 // the coverage factor where they are; 0 where they are not
	cross   [][]float64
}

// relative is an estimate of a positive quantity whose logarithm has gradient g: its interval is even in ratio.
func (e *estimator) relative(value float64, g []float64) *Estimate {
	u, k := e.spread(g)
	return &Estimate{Value: value, U: value * u, Low: value * math.Exp(-k*u), High: value * math.Exp(k*u)}
}

// absolute is an estimate of a quantity with gradient g.
func (e *estimator) absolute(value float64, g []float64) *Estimate {
	u, k := e.spread(g)
	return estimate(value, u, k)
}

// spread is the standard uncertainty of the combination g of the shared parameters (GUM 5.2.2), and the coverage factor of
// its 95 % interval.
func (e *estimator) spread(g []float64) (u, k float64) {
	variance := leastsq.Propagate(e.fit.Cov, mat.NewDense(1, len(g), g)).At(0, 0)
	if !(variance > 0) {
		return 0, normal95
	}
	u = math.Sqrt(variance)
	if e.student > 0 {
		return u * e.widen, e.student
	}
	if e.cross == nil {
		for j := range e.fit.D {
			e.cross = append(e.cross, e.fit.Cross(j))
		}
	}
	var shares []float64
	for j, c := range e.cross {
		if j < len(e.obs.caps) && !e.obs.caps[j].bound {
			continue // measured: a normal error
		}
		w := 0.0
		for i, x := range g {
			w += x * c[i]
		}
		shares = append(shares, w/u)
	}
	return u * e.widen, coverageFactor(shares)
}

// Correlation is how the errors of a fit's figures go together.
type Correlation struct {
	Of []string    `json:"of"` // the figures, by their names in JSON
	R  [][]float64 `json:"r"`  // correlation coefficients, in that order
}

// correlation propagates the covariance of the shared parameters to the figures of the given gradients (GUM 5.2, F.1.2).
func (e *estimator) correlation(of []string, gradients [][]float64) *Correlation {
	n := len(gradients[0])
	j := mat.NewDense(len(gradients), n, nil)
	for i, g := range gradients {
		j.SetRow(i, g)
	}
	cov := leastsq.Propagate(e.fit.Cov, j)
	c := &Correlation{Of: of}
	for i := range gradients {
		row := make([]float64, len(gradients))
		for k := range row {
			if d := math.Sqrt(cov.At(i, i) * cov.At(k, k)); d > 0 {
				row[k] = math.Max(-1, math.Min(1, cov.At(i, k)/d))
			}
		}
		row[i] = 1
		c.R = append(c.R, row)
	}
	return c
}
