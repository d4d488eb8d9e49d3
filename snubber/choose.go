package snubber

import (
	"context"
	"errors"
	"math"
	"sync"

	"ringbook/snubber/leastsq"

	"gonum.org/v1/gonum/stat/distuv"
)

// demanded is the probability of a chi-square as large as the plain model's below which the effects are tried, and worth
// is by how much one must lower the criterion to be added.
const (
	demanded = 0.05
	worth    = 0
)

// choose settles the plain model and, where its chi-square or a trial set aside demands it, the model with one effect
// more at a time, as long as that lowers the corrected Akaike criterion
//
//	AICc = chi2 + 2 k + 2 k (k + 1)/(n - k - 1)
//
// of n readings and k parameters (Hurvich and Tsai, Biometrika 76, 297, 1989, from memory). A trial set aside counts as a
// parameter for each of its readings, which is what it takes to explain it away, so that an effect that brings trials back
// is weighed against losing them.
func choose(ctx context.Context, obs *observations, start []float64) (*outcome, []effect, error) {
	plain := newModel(obs)
	best, err := plain.settle(ctx, start)
	if err != nil {
		return nil, nil, err
	}
	var used []effect
	for len(used) < int(noEffects) && best.wanting() {
		// The effects are tried beside each other; the choice between them is made in their order.
		var tried [noEffects]*outcome
		var errs [noEffects]error
		var wait sync.WaitGroup
		for e := range noEffects {
			if !contains(used, e) && obs.shows(e) && best.misses(e) {
				wait.Go(func() { tried[e], errs[e] = best.with(ctx, used, e) })
			}
		}
		wait.Wait()
		if err := errors.Join(errs[:]...); err != nil {
			return nil, nil, err
		}
		var better *outcome
		var with effect
		for e, out := range tried {
			if out != nil && out.criterion() < best.criterion()-worth && (better == nil || out.criterion() < better.criterion()) {
				better, with = out, effect(e)
			}
		}
		if better == nil {
			break
		}
		best, used = better, append(used, with)
	}
	return best, used, nil
}

// with is the outcome with one effect more; nil where it promises nothing or does not converge.
func (o *outcome) with(ctx context.Context, used []effect, e effect) (*outcome, error) {
	m := newModel(o.model.obs, append(append([]effect{}, used...), e)...)
	from := append(append([]float64{}, o.fit.P...), m.startOf(e, o.fit.P))
	from, err := m.promises(ctx, o, from)
	if err != nil || from == nil {
		return nil, err
	}
	out, err := m.settle(ctx, from)
	if err != nil || out.fit.Cov == nil || out.fit.Status != leastsq.Converged {
		return nil, err
	}
	return out, nil
}

// screened is on how many trials at most an effect is tried before it is fitted to all of them.
const screened = 60

// promises says whether the model may do better than the best so far, with the trials it kept or with those it set aside
// as well: where it may, with the parameters from which to fit it to all of them, else with none.
func (m *model) promises(ctx context.Context, best *outcome, start []float64) (from []float64, err error) {
	without := &outcome{model: m, kept: thin(best.kept, screened), aside: best.aside}
	all := &outcome{model: m, kept: without.kept}
	for k, a := range best.aside {
		if k < screened/3 {
			all.kept = append(append([]int{}, all.kept...), a.index)
		}
	}
	plain := &outcome{model: best.model, kept: without.kept, aside: best.aside, fit: best.fit}
	if len(without.kept) < len(best.kept) {
		fit, err := best.model.fit(ctx, plain.kept, best.fit.P, nil)
		if err != nil {
			return nil, err
		}
		plain.fit = fit
	}
	for _, o := range []*outcome{without, all} {
		fit, err := m.fit(ctx, o.kept, start, nil)
		if err != nil {
			return nil, err
		}
		o.fit = fit
		if fit.Cov != nil && o.criterion() < plain.criterion()-worth {
			return fit.P, nil
		}
		if len(best.aside) == 0 {
			break
		}
	}
	return nil, nil
}

// thin is at most n of the list, evenly spread.
func thin(list []int, n int) []int {
	if len(list) <= n {
		return list
	}
	out := make([]int, n)
	for k := range out {
		out[k] = list[k*(len(list)-1)/(n-1)]
	}
	return out
}

// wanting says whether the data demand more than the model has.
func (o *outcome) wanting() bool {
	if len(o.aside) > 0 {
		return true
	}
	dof := o.model.readings(o.kept) - o.model.params
	return dof > 0 && (distuv.ChiSquared{K: float64(dof)}).Survival(o.fit.Chi2) < demanded
}

func (o *outcome) criterion() float64 {
	k := float64(o.model.params)
	n := float64(o.model.readings(o.kept))
	for _, a := range o.aside {
		r := float64(o.model.obs.list[a.index].readings())
		k += r
		n += r
	}
	if n-k-1 <= 0 {
		return math.Inf(1)
	}
	return o.fit.Chi2 + 2*k + 2*k*(k+1)/(n-k-1)
}

// misses says whether the kind of reading that an effect bears on is less than well explained: the frequencies (with the
// parts' errors that explain them) for the leads, the peaks for the fall time, either for the junction. Where a trial was set
// aside anything may have done it.
func (o *outcome) misses(e effect) bool {
	if len(o.aside) > 0 {
		return true
	}
	var sum, n [3]float64
	var b leastsq.Block
	for _, i := range o.kept {
		x := &o.model.obs.list[i]
		o.model.eval(x, o.fit.P, o.fit.D, false, &b)
		row := 0
		for k, v := range x.value {
			if !math.IsNaN(v) {
				sum[k] += b.R[row] * b.R[row]
				n[k]++
				row++
			}
		}
	}
	for _, d := range o.fit.D {
		sum[ringAt] += d * d
	}
	poor := func(k int) bool { return n[k] > 0 && (distuv.ChiSquared{K: n[k]}).Survival(sum[k]) < 0.5 }
	switch e {
	case lead:
		return poor(ringAt)
	case fallTime:
		return poor(peakAt)
	}
	return poor(ringAt) || poor(peakAt)
}

// shows says whether the readings can show an effect at all.
func (o *observations) shows(e effect) bool {
	switch e {
	case fallTime:
		return o.counts[peakAt] > 0
	case lead:
		return len(o.caps) > 0
	default:
		return o.points[0].bus > 0
	}
}

// startOf is the logarithm of the size an effect starts with.
func (m *model) startOf(e effect, p []float64) float64 {
	switch e {
	case fallTime: // s: a part of the bare ring's period
		return p[0] + math.Log(2*math.Pi*0.1)
	case lead: // H: a part of the loop's
		return p[0] + p[1] + math.Log(0.03)
	default: // share
		return math.Log(0.2)
	}
}

func contains(list []effect, e effect) bool {
	for _, x := range list {
		if x == e {
			return true
		}
	}
	return false
}
