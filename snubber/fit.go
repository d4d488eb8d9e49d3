package snubber

import (
	"context"
	"errors"
	"fmt"
	"math"

	"ringbook/snubber/leastsq"
)

// FitResult is what the trials say of the loop. A nil estimate is a quantity they cannot tell.
type FitResult struct {
	Board      string     `json:"board"`
	Revision   string     `json:"revision"`
	Loop       LoopFit    `json:"loop"`
	Excitation *Estimate  `json:"excitation_a"` // A: the current that explains the peaks read; of several operating points, the largest
	Trials     int        `json:"trials"`       // how many were in scope and stood
	SetAside   []SetAside `json:"set_aside"`    // left out, with the reason
	Chi2       float64    `json:"chi2"`
	DOF        int        `json:"dof"`
	Status     string     `json:"status"` // "converged", or how else the fit ended
	Warnings   []string   `json:"warnings"`

	// Excitations are those of each operating point at which a peak was read.
	Excitations []PointExcitation `json:"excitations"`

	// Effects are those beyond the linear loop with ideal parts that the trials demand.
	Effects []Effect `json:"effects"`

	Line *SubstitutionLine `json:"-"` // the line of 1/(2 pi f0)^2 against added capacitance, without what was set aside; nil where none can be drawn

	// Correlation is that of the loop's figures and of the excitations, in the order of Excitations.
	Correlation *Correlation `json:"correlation"`

	// Suggestion is what to fit next from the E6 series; Next answers for the capacitors on hand.
	Suggestion *Suggestion `json:"next"`

	state *outcome // what the fit found, for questions asked of it later
}

// Effect is one effect beyond the linear loop that the trials demand, by the corrected Akaike criterion.
type Effect struct {
	Name string    `json:"effect"`
	Unit string    `json:"unit"` // of its size: "s", "H", or "" for a share of the node's capacitance
	Size *Estimate `json:"size"`
}

var effectUnit = [noEffects]string{fallTime: "s", lead: "H"}

// PointExcitation is the excitation of one operating point.
type PointExcitation struct {
	BusV       float64   `json:"bus_v"`        // V
	CurrentA   float64   `json:"current_a"`    // A: the load's; 0: not known
	Excitation *Estimate `json:"excitation_a"` // A
}

// LoopFit is the loop as fitted. Inductance, capacitance and resistance are the parameters; impedance and ring
// frequency follow from them with their correlation.
type LoopFit struct {
	Inductance  *Estimate `json:"inductance_h"`
	Capacitance *Estimate `json:"capacitance_f"` // the board's own, without a probe
	Resistance  *Estimate `json:"resistance_ohm"`
	Impedance   *Estimate `json:"impedance_ohm"`
	RingHz      *Estimate `json:"ring_hz"` // undamped, 1/(2 pi sqrt(L C)), without a probe
}

// SetAside names a trial left out of a fit, and why.
type SetAside struct {
	Trial   string `json:"trial"`
	Because string `json:"because"`
}

// Nominal is the loop at its estimates. What the trials cannot tell is zero.
func (f *FitResult) Nominal() Loop {
	return Loop{
		Inductance:  valueOf(f.Loop.Inductance),
		Capacitance: valueOf(f.Loop.Capacitance),
		Resistance:  valueOf(f.Loop.Resistance),
	}
}

func valueOf(e *Estimate) float64 {
	if e == nil {
		return 0
	}
	return e.Value
}

// Fit fits the loop of one board revision to every reading of its trials.
//
// The parameters are L, C, the loss r where a decay was read, and the excitation I0 of each operating point at which a
// peak was. Each reading is predicted by the exact response of its own network with the probe across the node: the damped
// frequency and the decay of the ringing pair, and the peak. A reading that was not taken is absent, and a trial that did
// not ring still counts through its peak. Each physical part (one drawer entry, or one nominal value and tolerance in one
// session) has one error, with its tolerance as prior, shared by all the trials it served in.
//
// A trial that does not belong with the others is set aside, with the reason (see SetAside). Intervals are 95 %: the
// combined uncertainty of all readings and parts with their correlations (GUM 5.2), times the coverage factor of the
// distribution the parts' rectangular tolerances and the readings make (GUM Supplement 1). Where chi-square says that the
// stated uncertainties are too small for the scatter (probability under 5 %), they are widened by the Birge ratio
// sqrt(chi2/dof), the coverage is Student's of the degrees of freedom (GUM G.3), and a warning says so (Birge, Phys. Rev. 40,
// 207, 1932, from memory).
func Fit(ctx context.Context, trials []Trial) (*FitResult, error) {
	f, err := fitTrials(ctx, trials)
	if err != nil {
		return nil, fmt.Errorf("fitting the loop: %w", err)
	}
	return f, nil
}

func fitTrials(ctx context.Context, trials []Trial) (*FitResult, error) {
	standing, err := oneRevision(trials)
	if err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	obs, err := observe(standing)
	if err != nil {
		return nil, err
	}
	if len(obs.list) == 0 {
		return nil, nothingToFit()
	}
	line := linePoints(standing)
	m := newModel(obs)
	start, err := m.start(line, standing)
	if err != nil {
		return nil, err
	}
	out, effects, err := choose(ctx, obs, start)
	if err != nil {
		return nil, err
	}
	if out.model.still(out.fit.P) {
		if out, effects, err = choose(ctx, obs, newModel(obs).from(out.model.loop(out.fit.P))); err != nil {
			return nil, err
		}
	}
	m = out.model
	if out.fit.Status == leastsq.Stopped {
		return nil, ctx.Err()
	}
	f := &FitResult{Board: standing[0].Board, Revision: standing[0].Revision, Trials: len(standing), SetAside: []SetAside{}, Effects: []Effect{}, Excitations: []PointExcitation{},
		Chi2: out.fit.Chi2, DOF: m.readings(out.kept) - m.params, Status: out.fit.Status.String(), Warnings: append([]string{}, obs.warnings...)}
	for _, a := range out.aside {
		f.SetAside = append(f.SetAside, SetAside{Trial: obs.list[a.index].trial.ID, Because: out.because(a)})
	}
	if err := line.enough(); err == nil && line.without(f.SetAside).fit() == nil {
		f.Line = line
	}
	return f, f.describe(out, effects)
}

// oneRevision is the trials that stand, all of one board revision.
func oneRevision(trials []Trial) ([]Trial, error) {
	var standing []Trial
	for _, t := range trials {
		if t.Struck != "" {
			continue
		}
		if len(standing) > 0 && (t.Board != standing[0].Board || t.Revision != standing[0].Revision) {
			return nil, fmt.Errorf("the trials are of two revisions, %s %s and %s %s, which have loops of their own: name one with --board and --revision",
				standing[0].Board, standing[0].Revision, t.Board, t.Revision)
		}
		standing = append(standing, t)
	}
	if len(standing) == 0 {
		return nil, errors.New("no trial in scope stands; take one bare and one with a known capacitor")
	}
	return standing, nil
}

// atRest is the relative standard uncertainty with which the capacitance that a ring sees, averaged over its swing, is that
// of the node at rest at the bus. With up to half of it a junction's the two differ by up to some one percent, more or less
// the same in every trial, so that trials at one operating point do not show it. Derived from junctionFactor; it counts where
// the trials state a bus, so that the swing is known to be of its size.
const atRest = 0.005

// describe gives the estimates of a fit.
func (f *FitResult) describe(out *outcome, effects []effect) error {
	m, fit := out.model, out.fit
	apart := errors.New("the trials cannot tell inductance and capacitance apart; fit a capacitor of about three times the node's capacitance and read the ring")
	if fit.Cov == nil {
		return apart
	}
	if m.loss < 0 {
		f.Warnings = append(f.Warnings, "no decay was read: the ring's frequency was taken as undamped, which makes the loop look slower, and the loss is not known; read decay_s")
	}
	e := &estimator{outcome: out, widen: out.scatter()}
	if e.widen > 1 {
		e.student = float64(f.DOF)
		f.Warnings = append(f.Warnings, fmt.Sprintf("the trials scatter %.3g times more than their stated uncertainties allow (chi-square %.3g for %s of freedom): the intervals were widened by that; look for a mislabelled capacitor or a misread frequency, or state larger uncertainties", e.widen, f.Chi2, degrees(f.DOF)))
	}
	g := func(terms map[int]float64) []float64 { // a gradient by the shared parameters
		v := make([]float64, m.params)
		for k, x := range terms {
			v[k] = x
		}
		return v
	}
	l := m.loop(fit.P)
	// ln L = ln T + ln Z0, ln C = ln T - ln Z0.
	of := []string{"inductance_h", "capacitance_f", "impedance_ohm", "ring_hz"}
	by := [][]float64{g(map[int]float64{0: 1, 1: 1}), g(map[int]float64{0: 1, 1: -1}), g(map[int]float64{1: 1}), g(map[int]float64{0: -1})}
	f.Loop.Inductance = e.relative(l.Inductance, by[0])
	f.Loop.Capacitance = e.relative(l.Capacitance, by[1])
	f.Loop.Impedance = e.relative(l.Impedance(), by[2])
	f.Loop.RingHz = e.relative(l.NaturalHz(), by[3])
	if l, c := f.Loop.Inductance, f.Loop.Capacitance; !(l.U <= l.Value && c.U <= c.Value) {
		if e.widen > 1 {
			return fmt.Errorf("the trials contradict each other: they scatter %.3g times more than their stated uncertainties allow, and no loop explains most of them; look for mislabelled capacitors and misread frequencies, or trials of another board", e.widen)
		}
		return apart
	}
	if m.ref > 0 && m.effect[junction] < 0 {
		f.Loop.Capacitance.allow(atRest)
		f.Loop.Impedance.allow(atRest / 2)
		f.Loop.RingHz.allow(atRest / 2)
	}
	if m.loss >= 0 {
		if r := e.relative(l.Resistance, g(map[int]float64{m.loss: 1})); r.U <= r.Value {
			f.Loop.Resistance = r
		} else {
			f.Warnings = append(f.Warnings, "the decays read do not tell the loss: its uncertainty is larger than it is; read decay_s with more repeats")
		}
	}
	for point, k := range m.amps {
		var x *Estimate
		switch {
		case k >= 0:
			x = e.absolute(math.Abs(fit.P[k]), g(map[int]float64{k: 1}))
			x.Low = math.Max(0, x.Low)
		case m.obs.points[point].still:
			x = out.smallExcitation(point)
		default:
			continue
		}
		f.Excitations = append(f.Excitations, PointExcitation{BusV: m.obs.points[point].bus, CurrentA: m.obs.points[point].load, Excitation: x})
		if f.Excitation == nil || x.Value > f.Excitation.Value {
			f.Excitation = x
		}
	}
	for _, x := range effects {
		k := m.effect[x]
		f.Effects = append(f.Effects, Effect{Name: x.String(), Unit: effectUnit[x], Size: e.relative(math.Exp(fit.P[k]), g(map[int]float64{k: 1}))})
	}
	if m.loss >= 0 {
		of, by = append(of, "resistance_ohm"), append(by, g(map[int]float64{m.loss: 1}))
	}
	for _, k := range m.amps {
		if k >= 0 {
			of, by = append(of, "excitation_a"), append(by, g(map[int]float64{k: 1}))
		}
	}
	f.Correlation = e.correlation(of, by)
	f.state = out
	f.Suggestion = f.Next(m.usualCandidates(f.Loop.Capacitance.Value))
	return nil
}

func degrees(n int) string { return count(n, "degree") }

// currentForPeak is the loop current, A, at which the network's exact peak is the one read, and the slope dV/dI
// there; ok is false where even no current peaks higher than read. The peak rises with the current, so that a
// bracket and bisection find it.
func currentForPeak(l Loop, n Network, bus, peak float64) (amps, slope float64, ok bool) {
	at := func(i float64) float64 { return respond(l, n, Excitation{Bus: bus, Current: i}).Peak().Volts }
	if at(0) >= peak {
		return 0, 0, false
	}
	low, high := 0.0, peak/l.Impedance()
	for range 60 {
		if at(high) >= peak {
			break
		}
		low, high = high, 2*high
	}
	for range 60 {
		mid := (low + high) / 2
		if at(mid) < peak {
			low = mid
		} else {
			high = mid
		}
	}
	amps = (low + high) / 2
	h := 1e-4 * amps
	return amps, (at(amps+h) - at(amps-h)) / (2 * h), true
}
