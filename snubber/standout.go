package snubber

import (
	"context"
	"math"

	"ringbook/snubber/leastsq"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"
)

// material is how far, relatively, a reading must lie from what the other trials predict for its trial to be set aside:
// of the ring's frequency, the decay and the peak. A mislabelled capacitor or a misread frequency is farther off; what is
// nearer may be the linear loop's own want of truth, and widens the intervals instead.
var material = [3]float64{ringAt: 0.015, decayAt: 0.2, peakAt: 0.06}

// materialAlone is the same for the peak of a trial that did not ring, which has nothing else to show a wrong part by.
const materialAlone = 0.015

// exactTrials is up to how many trials each is tested by a fit without it; beyond, by the linearised fit.
const exactTrials = 25

// test is how a trial is tested: exactly where they are few.
func (o *outcome) test() func(context.Context, int) (*aside, error) {
	quick := o.linearised()
	return func(ctx context.Context, i int) (*aside, error) {
		if len(o.kept) > exactTrials {
			return quick(ctx, i)
		}
		x := &o.model.obs.list[i]
		pulled := x.c >= 0 && math.Abs(o.fit.D[x.c]) > 1
		if a, err := quick(ctx, i); err != nil || a != nil && a.chance > 0.9 && !pulled {
			return nil, err // as sound as can be, and so is its part: no need of the exact test
		}
		return o.without(ctx, i)
	}
}

// without tests trial i by a fit without it; nil where the others cannot be fitted.
func (o *outcome) without(ctx context.Context, i int) (*aside, error) {
	kept := without(o.kept, i)
	if len(kept) == 0 || o.model.readings(kept) <= o.model.params {
		return nil, nil
	}
	fit, err := o.model.fit(ctx, kept, o.fit.P, nil)
	if err != nil {
		return nil, err
	}
	if fit.Cov == nil {
		return nil, nil
	}
	others := &outcome{model: o.model, fit: fit, kept: kept}
	if !others.far(i) {
		return nil, nil
	}
	a := o.judge(o.model.obs.list[i].readings(), o.fit.Chi2-fit.Chi2, fit.Chi2, o.model.readings(kept)-o.model.params)
	a.index = i
	// Two tests, each of half the allowance.
	wrong := others.mislabelled(i) * float64(len(o.kept))
	a.part = 2*wrong <= falseAlarm
	a.chance = math.Min(1, 2*math.Min(a.chance, wrong))
	return a, nil
}

// mislabelled is the probability that the capacitor of trial i is within its tolerance, by the ring (or else the peak) the
// trial read, as the fit of the other trials predicts it; 1 where the part served in those too, or is not known by a bound.
// The least squares take a tolerance for a normal error, which may lie anywhere; this test knows that it ends.
func (o *outcome) mislabelled(i int) float64 {
	x := &o.model.obs.list[i]
	if x.c < 0 || !o.model.obs.caps[x.c].bound || o.model.obs.caps[x.c].uses > 1 || o.fit.Cov == nil {
		return 1
	}
	k := ringAt
	if math.IsNaN(x.value[ringAt]) {
		if k = peakAt; math.IsNaN(x.value[peakAt]) {
			return 1
		}
	}
	var b leastsq.Block
	o.model.eval(x, o.fit.P, o.fit.D, true, &b)
	row := 0
	if k == peakAt {
		row = len(b.R) - 1
	}
	// In units of the reading's uncertainty and of the part's: the part must be off by e/slope to explain the reading.
	n := o.model.params
	v := mat.NewVecDense(n, b.P[row*n:(row+1)*n])
	u := math.Sqrt(1 + mat.Inner(v, o.fit.Cov, v))
	slope := math.Abs(b.D[0][row])
	beyond := math.Abs(b.R[row]) - math.Sqrt(3)*slope
	dof := o.model.readings(o.kept) - n
	if scatter := o.scatter(); scatter > 1 {
		return 2 * distuv.StudentsT{Sigma: 1, Nu: float64(dof)}.Survival(beyond/(u*scatter))
	}
	return 2 * distuv.UnitNormal.Survival(beyond/u)
}

// far says whether a reading of trial i is materially off what the fit predicts.
func (o *outcome) far(i int) bool {
	x := &o.model.obs.list[i]
	v := o.model.values(x, o.fit.P, o.fit.D)
	if x.c >= 0 && o.model.obs.caps[x.c].uses == 1 {
		// A part that served nowhere else is at what is printed on it: its error as fitted is what this trial made of it.
		v[atCs] = o.model.obs.caps[x.c].value
	}
	signs, _ := v.signs(!math.IsNaN(x.value[peakAt]))
	for k, s := range signs {
		allowed := material[k]
		if k == peakAt && math.IsNaN(x.value[ringAt]) {
			allowed = materialAlone
		}
		if math.Abs(s-x.value[k]) > allowed*x.value[k] {
			return true
		}
	}
	return false
}

// scatter is how many times more than they state the trials kept scatter; 1 where that may be chance.
func (o *outcome) scatter() float64 {
	dof := float64(o.model.readings(o.kept) - o.model.params)
	if dof <= 0 || (distuv.ChiSquared{K: dof}).Survival(o.fit.Chi2) >= 0.05 {
		return 1
	}
	return math.Sqrt(o.fit.Chi2 / dof)
}

// judge gives the probability, among all trials kept, of a fall of chi2 as large by chance, when so many readings go and
// the others are left with chi2 for dof degrees of freedom.
func (o *outcome) judge(readings int, fall, chi2 float64, dof int) *aside {
	k := float64(readings)
	chance := distuv.ChiSquared{K: k}.Survival(math.Max(fall, 0))
	if dof > 0 && (distuv.ChiSquared{K: float64(dof)}).Survival(chi2) < 0.05 { // as scatter has it
		chance = distuv.F{D1: k, D2: float64(dof)}.Survival(math.Max(fall, 0) / k / (chi2 / float64(dof)))
	}
	return &aside{fall: fall, chance: math.Min(1, chance*float64(len(o.kept)))}
}

// linearised tests each trial by the fit linearised at its minimum: with e the trial's residuals and H their part of the
// hat matrix, chi-square falls by e'(I - H)^-1 e when it goes (Cook and Weisberg, as above).
func (o *outcome) linearised() func(context.Context, int) (*aside, error) {
	dof := o.model.readings(o.kept) - o.model.params
	var b leastsq.Block
	var j, jc, h, y mat.Dense // kept from trial to trial
	return func(_ context.Context, i int) (*aside, error) {
		if o.fit.Cov == nil {
			return nil, nil
		}
		x := &o.model.obs.list[i]
		o.model.eval(x, o.fit.P, o.fit.D, true, &b)
		cov := o.fit.Joint(b.First, b.Second)
		n, k := cov.SymmetricDim(), len(b.R)
		j.Reset()
		j.ReuseAs(k, n)
		for r := range k {
			for c := range o.model.params {
				j.Set(r, c, b.P[r*o.model.params+c])
			}
			at := o.model.params
			if b.First >= 0 {
				j.Set(r, at, b.D[0][r])
				at++
			}
			if b.Second >= 0 {
				j.Set(r, at, b.D[1][r])
			}
		}
		jc.Reset()
		jc.Mul(&j, cov)
		h.Reset()
		h.Mul(&jc, j.T())
		for r := range k {
			for c := range k {
				v := -h.At(r, c)
				if r == c {
					v++
				}
				h.Set(r, c, v)
			}
		}
		y.Reset()
		if err := y.Solve(&h, mat.NewDense(k, 1, b.R)); err != nil {
			return nil, nil // the others say nothing of this trial
		}
		fall := 0.0
		for r, e := range b.R {
			fall += e * y.At(r, 0)
		}
		if len(o.kept) > exactTrials && !o.far(i) {
			return nil, nil
		}
		a := o.judge(k, fall, math.Max(o.fit.Chi2-fall, 0), dof-k)
		a.index = i
		return a, nil
	}
}

func without(list []int, x int) []int {
	out := make([]int, 0, len(list))
	for _, i := range list {
		if i != x {
			out = append(out, i)
		}
	}
	return out
}
