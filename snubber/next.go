package snubber

import (
	"math"
	"sort"

	"ringbook/snubber/leastsq"
	"ringbook/snubber/preferred"

	"gonum.org/v1/gonum/mat"
)

// Suggestion is the capacitor whose trial would tell most next, and what it would gain.
type Suggestion struct {
	C          float64 `json:"c_f"`         // F
	ImpedanceU float64 `json:"impedance_u"` // ohm: standard uncertainty of Z0 with one more trial
	Gain       float64 `json:"gain"`        // fraction by which it falls
	Enough     bool    `json:"enough"`      // the gain is not worth the soldering: stop here
	Because    string  `json:"because"`     // why, in words
}

// worthSoldering is the least gain for which another trial is worth its while. Common practice has no figure: below it,
// four more trials would not halve the uncertainty.
const worthSoldering = 0.1

// Candidate is a capacitor on hand.
type Candidate struct {
	C    float64 // F, > 0
	CTol float64 // bound of its error, fraction; where U is not zero, ignored
	U    float64 // F: standard uncertainty of C as measured; 0: not measured
}

// Next says which of the capacitors on hand would, in one more trial with nothing else fitted, shrink the standard
// uncertainty of Z0 most (expected information; Fedorov, Theory of Optimal Experiments, 1972, from memory). The trial is
// supposed to read what the series reads, each as well as the median of the series. Capacitors that served already are
// left out: their error is known by now, and shared. It is nil where there is no candidate.
func (f *FitResult) Next(on []Candidate) *Suggestion {
	if f.state == nil {
		return nil
	}
	m, fit := f.state.model, f.state.fit
	old := math.Sqrt(fit.Cov.At(1, 1))
	var info mat.SymDense
	if err := invert(&info, fit.Cov); err != nil {
		return nil
	}
	var best *Suggestion
	for _, c := range on {
		if !(c.C > 0) || m.served(c.C) {
			continue
		}
		after, ok := m.with(&info, f.state, c)
		if !ok {
			continue
		}
		if gain := 1 - after/old; best == nil || gain > best.Gain {
			best = &Suggestion{C: c.C, ImpedanceU: after * f.Loop.Impedance.Value, Gain: gain}
		}
	}
	if best == nil {
		return nil
	}
	if best.Enough = best.Gain < worthSoldering; best.Enough {
		best.Because = "no capacitor at hand would shrink the uncertainty of Z0 by a tenth"
	} else {
		best.Because = "it would shrink the uncertainty of Z0 most"
	}
	return best
}

// usualCandidates are what a bench has: the E6 series around the node's capacitance, as well known as the capacitors of the
// series.
func (m *model) usualCandidates(c float64) []Candidate {
	values, err := preferred.E6.Between(0.3*c, 12*c)
	if err != nil {
		return nil
	}
	tol := m.usualTolerance()
	var on []Candidate
	for _, v := range values {
		on = append(on, Candidate{C: v, CTol: tol})
	}
	return on
}

// UsualTolerance is the median tolerance of the capacitors of the series, as a fraction; 5 % where none was fitted.
func (f *FitResult) UsualTolerance() float64 {
	if f.state == nil {
		return unstatedTol
	}
	return f.state.model.usualTolerance()
}

func (m *model) usualTolerance() float64 {
	var tols []float64
	for _, p := range m.obs.caps {
		tols = append(tols, p.u/p.value*math.Sqrt(3))
	}
	if len(tols) == 0 {
		return unstatedTol
	}
	return median(tols)
}

func (m *model) served(c float64) bool {
	for _, x := range m.obs.list {
		if x.trial.Network.Kind == C && same(x.trial.Network.C, c) {
			return true
		}
	}
	return false
}

// with is the relative standard uncertainty of Z0 after one more trial with a capacitor, and false where its response
// cannot be had.
func (m *model) with(info *mat.SymDense, o *outcome, c Candidate) (float64, bool) {
	u := c.U
	if u == 0 {
		u = c.C * c.CTol / math.Sqrt(3)
	}
	// A copy of a trial of the series, preferably one that read all, with the new part in it.
	like := o.kept[0]
	for _, i := range o.kept {
		if m.obs.list[i].readings() > m.obs.list[like].readings() {
			like = i
		}
	}
	x := m.obs.list[like]
	t := *x.trial
	t.Network = Network{Kind: C, C: c.C}
	x.trial, x.c, x.r = &t, len(m.obs.caps), -1
	obs := *m.obs
	obs.caps = append(append([]physicalPart{}, obs.caps...), physicalPart{value: c.C, u: u, bound: true})
	trial := *m
	trial.obs = &obs
	d := make([]float64, len(obs.caps)+len(obs.ohms))
	v := trial.values(&x, o.fit.P, d)
	signs, _ := v.signs(true)
	for k := range x.value {
		x.value[k], x.u[k] = math.NaN(), math.NaN()
		if rel := m.obs.typical(k); rel > 0 && signs[k] > 0 {
			x.value[k], x.u[k] = signs[k], rel*signs[k]
		}
	}
	if math.IsNaN(x.value[ringAt]) {
		x.value[decayAt] = math.NaN() // what does not ring has no envelope
	}
	var b leastsq.Block
	trial.eval(&x, o.fit.P, d, true, &b)
	n := m.params
	after := mat.NewSymDense(n, nil)
	after.CopySym(info)
	// The rows' information, less what the part's own error takes of it (Schur complement with its prior).
	part := 1.0
	cross := make([]float64, n)
	for i := range b.R {
		row := b.P[i*n : (i+1)*n]
		part += b.D[0][i] * b.D[0][i]
		for j, p := range row {
			cross[j] += b.D[0][i] * p
			for k := j; k < n; k++ {
				after.SetSym(j, k, after.At(j, k)+p*row[k])
			}
		}
	}
	for j := range n {
		for k := j; k < n; k++ {
			after.SetSym(j, k, after.At(j, k)-cross[j]*cross[k]/part)
		}
	}
	var cov mat.SymDense
	if err := invert(&cov, after); err != nil || !(cov.At(1, 1) > 0) {
		return 0, false
	}
	return math.Sqrt(cov.At(1, 1)), true
}

// typical is the median relative uncertainty of a kind of reading; 0 where none was taken.
func (o *observations) typical(k int) float64 {
	var all []float64
	for _, x := range o.list {
		if !math.IsNaN(x.value[k]) {
			all = append(all, x.u[k]/x.value[k])
		}
	}
	if len(all) == 0 {
		return 0
	}
	return median(all)
}

func median(v []float64) float64 {
	sort.Float64s(v)
	return v[len(v)/2]
}

// invert writes the inverse of a positive definite matrix.
func invert(dst *mat.SymDense, a mat.Symmetric) error {
	var chol mat.Cholesky
	if !chol.Factorize(a) {
		return mat.Condition(math.Inf(1))
	}
	err := chol.InverseTo(dst)
	if _, ok := err.(mat.Condition); ok {
		return nil // large, yet an answer
	}
	return err
}
