package snubber

import (
	"context"
	"fmt"
	"math"

	"ringbook/snubber/leastsq"
	"ringbook/snubber/quantity"

	"gonum.org/v1/gonum/stat/distuv"
)

// falseAlarm is the probability with which a board whose trials are all sound loses one of them.
const falseAlarm = 0.01

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
	chance := fmt.Sprintf("%.1g", a.chance)
	if a.chance < 1e-12 { // beyond what the distributions are good for
		chance = "below 1e-12"
	}
	return text + fmt.Sprintf(" (chi-square falls by %.1f without it, chance %s)", a.fall, chance)
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
