package snubber

import (
	"math"

	"ringbook/snubber/leastsq"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// estimator turns derivatives by the fit's shared parameters into estimates with their 95 % intervals.
type estimator struct {
	*outcome
	widen   float64 // the factor by which the stated uncertainties are widened
	student float64 // the degrees of freedom behind that; 0: they are not widened

	cross [][]float64 // the covariance of each part's error with the shared parameters
	rows  []readRow   // the readings with few repeats
}

// readRow is how far the shared parameters move with one reading, in units of its standard uncertainty.
type readRow struct {
	moves      []float64
	typeA, dof float64
}

// relative is an estimate of a positive quantity whose logarithm has gradient g: its interval is even in ratio.
func (e *estimator) relative(value float64, g []float64) *Estimate {
	u, law := e.spread(g, 0)
	k := law.factor()
	return &Estimate{Value: value, U: value * u, Low: value * math.Exp(-k*u), High: value * math.Exp(k*u), DOF: law.dof}
}

// absolute is an estimate of a quantity with gradient g.
func (e *estimator) absolute(value float64, g []float64) *Estimate {
	u, law := e.spread(g, 0)
	return law.estimate(value, u)
}

// estimate is a value with its standard uncertainty, whose error has the law.
func (l law) estimate(value, u float64) *Estimate {
	x := estimate(value, u, l.factor())
	x.DOF = l.dof
	return x
}

// spread is the standard uncertainty of the combination g of the shared parameters and of one more, independent and normal,
// component (GUM 5.2.2), and the law of its error.
func (e *estimator) spread(g []float64, more float64) (u float64, l law) {
	variance := leastsq.Propagate(e.fit.Cov, mat.NewDense(1, len(g), g)).At(0, 0)
	fitted := math.Sqrt(math.Max(variance, 0)) * e.widen
	if u = math.Hypot(fitted, more); !(u > 0) {
		return 0, law{}
	}
	if e.student > 0 {
		return u, law{dof: e.student * math.Pow(u/fitted, 4)}
	}
	e.prepare()
	for j, c := range e.cross {
		if j < len(e.model.obs.caps) && !e.model.obs.caps[j].bound {
			continue // measured: a normal error
		}
		l.shares = append(l.shares, floats.Dot(g, c)/u)
	}
	// Welch and Satterthwaite's formula over the parts that rest on the scatter of repeats (GUM G.4.1, equation G.2b).
	sum := 0.0
	for _, r := range e.rows {
		part := floats.Dot(g, r.moves) / u
		sum += math.Pow(part*part*r.typeA, 2) / r.dof
	}
	if l.dof = 1 / sum; sum == 0 || l.dof > 200 {
		l.dof = 0
	}
	return u, l
}

// prepare fills what every estimate needs.
func (e *estimator) prepare() {
	if e.cross != nil {
		return
	}
	e.cross = [][]float64{}
	for j := range e.fit.D {
		e.cross = append(e.cross, e.fit.Cross(j))
	}
	m := e.model
	var b leastsq.Block
	for _, i := range e.kept {
		x := &m.obs.list[i]
		if x.dof == [3]float64{} {
			continue
		}
		m.eval(x, e.fit.P, e.fit.D, true, &b)
		e.repeats(x, &b)
	}
}

// repeats takes in the readings of a trial that rest on few repeats; its derivatives are b.
func (e *estimator) repeats(x *observed, b *leastsq.Block) {
	row := 0
	for k, v := range x.value {
		if math.IsNaN(v) {
			continue
		}
		if x.dof[k] > 0 {
			e.rows = append(e.rows, readRow{moves: e.moves(b, row), typeA: x.typeA[k], dof: x.dof[k]})
		}
		row++
	}
}

// moves is how far the shared parameters move with one reading: the covariance of the solution times the reading's row of
// derivatives.
func (e *estimator) moves(b *leastsq.Block, row int) []float64 {
	n := e.model.params
	out := make([]float64, n)
	p := b.P[row*n : (row+1)*n]
	for i := range out {
		for j, x := range p {
			out[i] += e.fit.Cov.At(i, j) * x
		}
	}
	if b.First >= 0 {
		floats.AddScaled(out, b.D[0][row], e.cross[b.First])
	}
	if b.Second >= 0 {
		floats.AddScaled(out, b.D[1][row], e.cross[len(e.model.obs.caps)+b.Second])
	}
	return out
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
