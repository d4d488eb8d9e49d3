package snubber

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// FitResult is what the trials say of the loop. A nil estimate is a quantity they cannot tell.
type FitResult struct {
	Board      string     `json:"board"`
	Revision   string     `json:"revision"`
	Loop       LoopFit    `json:"loop"`
	Excitation *Estimate  `json:"excitation_a"` // A: the current that explains the peaks read
	Trials     int        `json:"trials"`       // how many were in scope and stood
	SetAside   []SetAside `json:"set_aside"`    // left out, with the reason
	Chi2       float64    `json:"chi2"`
	DOF        int        `json:"dof"`
	Status     string     `json:"status"` // "converged", or how else the fit ended
	Warnings   []string   `json:"warnings"`

	Line *SubstitutionLine `json:"-"` // the line of 1/(2 pi f0)^2 against added capacitance
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

// Fit fits the loop of one board revision to its trials.
//
// Inductance and capacitance come from the substitution line (FitLine). The loss resistance follows from the
// decay of the trials with nothing or a capacitor alone, r = 2 L/tau, and the excitation from the peaks, as the
// current that makes the exact peak of each trial's own network the one read, at the bus voltage of the trial.
//
// Where chi-square says that the stated uncertainties are too small for the scatter (probability under 5 %), they
// are widened by the Birge ratio sqrt(chi2/dof), the interval takes Student's t of the degrees of freedom, and a
// warning says so (GUM G.3; Birge, Phys. Rev. 40, 207, 1932, from memory).
func Fit(ctx context.Context, trials []Trial) (*FitResult, error) {
	standing, err := oneRevision(trials)
	if err != nil {
		return nil, fmt.Errorf("fitting the loop: %w", err)
	}
	if err := ctx.Err(); err != nil {
		return nil, fmt.Errorf("fitting the loop: %w", err)
	}
	line, err := FitLine(standing)
	if err != nil {
		return nil, fmt.Errorf("fitting the loop: %w", err)
	}
	f := &FitResult{
		Board: standing[0].Board, Revision: standing[0].Revision,
		Trials: len(standing), SetAside: []SetAside{}, Chi2: line.Chi2, DOF: line.DOF, Status: "converged",
		Warnings: append([]string{}, line.Warnings...), Line: line,
	}
	k, widen := f.coverage()
	f.loop(line, widen, k)
	f.loss(standing, widen, k)
	f.excitation(standing, k)
	return f, nil
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

// coverage is the coverage factor of 95 % intervals and the factor by which uncertainties are widened.
func (f *FitResult) coverage() (k, widen float64) {
	if f.DOF == 0 || (distuv.ChiSquared{K: float64(f.DOF)}).Survival(f.Chi2) >= 0.05 {
		return normal95, 1
	}
	widen = math.Sqrt(f.Chi2 / float64(f.DOF))
	f.Warnings = append(f.Warnings, fmt.Sprintf("the trials scatter %.3g times more than their stated uncertainties allow (chi-square %.3g for %d degrees of freedom): the intervals were widened by that; look for a mislabelled capacitor or a misread frequency, or state larger uncertainties", widen, f.Chi2, f.DOF))
	return distuv.StudentsT{Sigma: 1, Nu: float64(f.DOF)}.Quantile(0.975), widen
}

// loop takes L, C and what follows from them off the line: L = b, C = a/b, Z0 = b/sqrt(a), f0 = 1/(2 pi sqrt(a)),
// with intercept a and slope b; uncertainties to first order with their covariance (GUM 5.2).
func (f *FitResult) loop(line *SubstitutionLine, widen, k float64) {
	a, b := line.Intercept, line.Slope
	u := func(da, db float64) float64 { // of a function with these derivatives by a and b
		return widen * math.Sqrt(math.Max(0, da*da*line.InterU*line.InterU+2*da*db*line.Cov+db*db*line.SlopeU*line.SlopeU))
	}
	f.Loop.Inductance = estimate(b, u(0, 1), k)
	f.Loop.Capacitance = estimate(a/b, u(1/b, -a/(b*b)), k)
	f.Loop.Impedance = estimate(b/math.Sqrt(a), u(-b/(2*a*math.Sqrt(a)), 1/math.Sqrt(a)), k)
	f.Loop.RingHz = estimate(1/(2*math.Pi*math.Sqrt(a)), u(1/(4*math.Pi*a*math.Sqrt(a)), 0), k)
}

func (f *FitResult) loss(trials []Trial, widen, k float64) {
	rate, ru := meanDecayRate(trials)
	if rate == 0 {
		return
	}
	l := f.Loop.Inductance
	f.Loop.Resistance = estimate(2*l.Value*rate, 2*math.Hypot(l.U*rate, l.Value*ru*widen), k)
}

// excitation is the weighted mean of the currents that explain each peak read.
func (f *FitResult) excitation(trials []Trial, k float64) {
	var sum, weight float64
	loop := f.Nominal()
	for _, t := range trials {
		peak, ok := t.Reading(PeakV)
		if !ok || t.Network.Kind == RCD || !(t.Operating().BusV > 0) {
			continue
		}
		u := peak.U
		if u == 0 {
			u = unstatedPeak * peak.Value
		}
		i, slope, ok := currentForPeak(loop.WithProbe(t.ProbeC), t.Network, t.Operating().BusV, peak.Value)
		if !ok {
			continue
		}
		ui := u / slope
		sum += i / (ui * ui)
		weight += 1 / (ui * ui)
	}
	if weight > 0 {
		f.Excitation = estimate(sum/weight, 1/math.Sqrt(weight), k)
	}
}

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
