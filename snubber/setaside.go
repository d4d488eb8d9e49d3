package snubber

import (
	"context"
	"fmt"
	"math"

	"ringbook/snubber/leastsq"
	"ringbook/snubber/quantity"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"
)

// falseAlarm is the probability with which a board whose trials are all sound loses one of them.
const falseAlarm = 0.01

// material is how far, relatively, a reading must lie from what the other trials predict for its trial to be set aside:
// of the ring's frequency, the decay and the peak. A mislabelled capacitor or a misread frequency is farther off; what is
// nearer may be the linear loop's own want of truth, and widens the intervals instead.
var material = [3]float64{ringAt: 0.015, decayAt: 0.2, peakAt: 0.06}

// materialAlone is the same for the peak of a trial that did not ring, which has nothing else to show a wrong part by.
const materialAlone = 0.015

// exactTrials is up to how many trials each is tested by a fit without it; beyond, by the linearised fit.
const exactTrials = 25

// outcome is a fit of the trials that are kept.
type outcome struct {
	model *model
	fit   *leastsq.PartitionedResult
	kept  []int // indices of observations
	aside []aside
}

// aside is a trial left out, by its index of observations, with how far it stands from the others: the fall of chi2
// when it goes, and the probability of as much by chance among all the trials.
type aside struct {
	index  int
	fall   float64
	chance float64
	part   bool // its capacitor lies outside its tolerance
}

// weight is how much better the others agree without the trial. A wrong capacitor is the commoner mistake than a wrong
// reading of everything: ten to one, where both explain as much (common practice has no figure).
func (a *aside) weight() float64 {
	if a.part {
		return a.fall + 2*math.Ln10
	}
	return a.fall
}

// settle fits, and sets aside what does not belong.
//
// Where the trials scatter more than they state it starts anew with a robust loss (Cauchy's, a trial at a time), so that a
// wrong trial does not lead the fit. Then each
// trial is left out in turn: what chi-square falls by is, for a sound trial, itself distributed as chi-square with as many
// degrees of freedom as the trial has readings (the likelihood-ratio test of a shift of its mean; Cook and Weisberg,
// Residuals and Influence in Regression, 1982, section 2.2.2, from memory). The trial that stands farthest goes
// where it is materially off and that is less likely than falseAlarm over the number of trials (Bonferroni); where the others scatter more than they
// state, the test is the F of fall and scatter instead. At most a third go. One set aside comes back when the others
// later agree with it.
func (m *model) settle(ctx context.Context, start []float64) (*outcome, error) {
	all := make([]int, len(m.obs.list))
	for i := range all {
		all[i] = i
	}
	fit, err := m.fit(ctx, all, start, nil)
	if err != nil {
		return nil, err
	}
	o := &outcome{model: m, fit: fit, kept: all}
	if o.scatter() > 1 {
		robust, err := m.fit(ctx, all, start, leastsq.Cauchy(2.385))
		if err != nil {
			return nil, err
		}
		if o.fit, err = m.fit(ctx, all, robust.P, nil); err != nil {
			return nil, err
		}
	}
	for len(o.aside) < len(all)/3 {
		worst, err := o.worst(ctx)
		if err != nil {
			return nil, err
		}
		gone, err := o.worstPart(ctx, worst, len(all)/3-len(o.aside))
		if err != nil {
			return nil, err
		}
		if gone == nil && worst != nil {
			gone = []aside{*worst}
		}
		if gone == nil {
			break
		}
		if err := o.drop(ctx, gone); err != nil {
			return nil, err
		}
	}
	return o, o.readmit(ctx)
}

// drop sets trials aside and fits the others.
func (o *outcome) drop(ctx context.Context, gone []aside) error {
	for _, a := range gone {
		o.kept = without(o.kept, a.index)
	}
	o.aside = append(o.aside, gone...)
	fit, err := o.model.fit(ctx, o.kept, o.fit.P, nil)
	if err != nil {
		return err
	}
	o.fit = fit
	return nil
}

// worst is the trial that stands farthest from the others, where that is no chance; nil where there is none.
func (o *outcome) worst(ctx context.Context) (*aside, error) {
	// Where even the whole chi-square is no surprise for one trial's readings, no trial can be one.
	if (distuv.ChiSquared{K: 1}).Survival(o.fit.Chi2) > falseAlarm/float64(len(o.kept)) {
		return nil, nil
	}
	test := o.test()
	var worst *aside
	for _, i := range o.kept {
		a, err := test(ctx, i)
		if err != nil {
			return nil, err
		}
		// Of those that no chance explains, the one without which the others agree best.
		if a != nil && a.chance <= falseAlarm && (worst == nil || a.weight() > worst.weight()) {
			worst = a
		}
	}
	return worst, nil
}

// worstPart is the trials of one capacitor that served in several, where leaving all of them out explains more than leaving
// out the worst single trial: a part with the wrong value on it spoils each trial it was fitted in, and none of them stands
// alone. They are at most room. Nil where there is no such part; in a long series none is looked for, since single trials
// show there.
func (o *outcome) worstPart(ctx context.Context, single *aside, room int) ([]aside, error) {
	if len(o.kept) > exactTrials || o.scatter() <= 1 {
		return nil, nil
	}
	best := 2.0 // by Akaike's measure: the fall of chi-square less twice the readings given up
	if single != nil {
		best += single.weight() - 2*float64(o.model.obs.list[single.index].readings())
	}
	var worst []aside
	for part := range o.model.obs.caps {
		var served []int
		kept := o.kept
		for _, i := range o.kept {
			if o.model.obs.list[i].c == part {
				served, kept = append(served, i), without(kept, i)
			}
		}
		if len(served) < 2 || len(served) > room || o.model.readings(kept) <= o.model.params {
			continue
		}
		fit, err := o.model.fit(ctx, kept, o.fit.P, nil)
		if err != nil {
			return nil, err
		}
		others := &outcome{model: o.model, fit: fit, kept: kept}
		k := o.model.readings(served)
		fall := o.fit.Chi2 - fit.Chi2
		a := o.judge(k, fall, fit.Chi2, o.model.readings(kept)-o.model.params)
		if fit.Cov == nil || a.chance > falseAlarm || fall-2*float64(k) <= best {
			continue
		}
		best, worst = fall-2*float64(k), nil
		for _, i := range served {
			if others.far(i) {
				b := *a
				b.index, b.part = i, true
				worst = append(worst, b)
			}
		}
		if len(worst) < len(served) {
			worst = nil
		}
	}
	return worst, nil
}

// test is how a trial is tested: exactly where they are few.
func (o *outcome) test() func(context.Context, int) (*aside, error) {
	quick := o.linearised()
	if len(o.kept) > exactTrials {
		return quick
	}
	return func(ctx context.Context, i int) (*aside, error) {
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

// readmit takes back each trial set aside that the others agree with after all.
func (o *outcome) readmit(ctx context.Context) error {
	for k := len(o.aside) - 1; k >= 0; k-- {
		a := o.aside[k]
		kept := append(append([]int{}, o.kept...), a.index)
		fit, err := o.model.fit(ctx, kept, o.fit.P, nil)
		if err != nil {
			return err
		}
		back := &outcome{model: o.model, fit: fit, kept: kept}
		again, err := back.test()(ctx, a.index)
		if err != nil {
			return err
		}
		if again == nil || again.chance > falseAlarm {
			o.fit, o.kept = fit, kept
			o.aside = append(o.aside[:k], o.aside[k+1:]...)
		} else {
			o.aside[k] = *again
		}
	}
	return nil
}

// because says why a trial was set aside, by the reading that is farthest from what the others predict.
func (o *outcome) because(a aside) string {
	x := &o.model.obs.list[a.index]
	// Predicted with the part as the others know it: one that served nowhere else is at what is printed on it.
	v := o.model.values(x, o.fit.P, o.fit.D)
	signs, _ := v.signs(!math.IsNaN(x.value[peakAt]))
	worst, far := 0, -1.0
	for k, s := range signs {
		if !math.IsNaN(x.value[k]) {
			if z := math.Abs(s-x.value[k]) / x.u[k]; z > far {
				worst, far = k, z
			}
		}
	}
	unit := [3]quantity.Unit{quantity.Frequency, quantity.Time, quantity.Voltage}[worst]
	text := fmt.Sprintf("it reads %s = %s where the other trials predict %s", observedQuantity[worst], quantity.Format(x.value[worst], unit, 4), quantity.Format(signs[worst], unit, 4))
	if x.c >= 0 && worst == ringAt {
		if c := o.model.capacitorFor(x, o.fit.P); c > 0 {
			text += fmt.Sprintf("; that would take %s where %s is written", farads(c), farads(x.trial.Network.C))
		}
	}
	return text + fmt.Sprintf(" (chi-square falls by %.1f without it, chance %.1g)", a.fall, a.chance)
}

// capacitorFor is the capacitor that would explain the ring a trial with a capacitor alone read; 0 where none would.
func (m *model) capacitorFor(x *observed, p []float64) float64 {
	if x.trial.Network.Kind != C {
		return 0
	}
	l := m.loop(p)
	w := 2 * math.Pi * x.value[ringAt]
	d := l.Resistance / (2 * l.Inductance)
	return math.Max(0, 1/((w*w+d*d)*l.Inductance)-l.Capacitance-x.trial.ProbeC)
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
