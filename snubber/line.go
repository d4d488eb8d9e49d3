package snubber

import (
	"errors"
	"fmt"
	"math"

	"ringbook/snubber/leastsq"
	"ringbook/snubber/quantity"
)

// LinePoint is one trial on the substitution line.
type LinePoint struct {
	Trial    string
	Kind     Kind    // bare or c
	AddedC   float64 // F: what was fitted across the node, with the probe
	AddedU   float64 // F, standard uncertainty
	Inverse  float64 // 1/(2 pi f0)^2, s^2, of the undamped frequency
	InverseU float64 // s^2, standard uncertainty
	Residual float64 // Inverse less the line's, s^2
}

// SubstitutionLine is the straight line of 1/(2 pi f0)^2 against added capacitance: its slope is the loop's
// inductance, and it meets zero at minus the loop's capacitance.
//
//	1/(2 pi f0)^2 = L Cadd + L C
type SubstitutionLine struct {
	Points    []LinePoint
	Slope     float64 // H
	Intercept float64 // s^2
	SlopeU    float64 // H
	InterU    float64 // s^2
	Cov       float64 // H s^2, of slope and intercept
	Chi2      float64
	DOF       int
}

// At is the line at an added capacitance (F), s^2, with its standard uncertainty.
func (s *SubstitutionLine) At(c float64) (y, u float64) {
	return s.Intercept + s.Slope*c, math.Sqrt(math.Max(0, s.InterU*s.InterU+2*c*s.Cov+c*c*s.SlopeU*s.SlopeU))
}

// FitLine fits the substitution line to the trials of one board revision that fitted nothing or a capacitor alone
// and read the ring's frequency.
//
// Both coordinates carry uncertainty (York, Evensen, Martinez and De Basabe Delgado, Am. J. Phys. 72, 367, 2004):
// the capacitor's, from its measurement or its tolerance, and the frequency's. The frequency as seen is damped; it
// is corrected to undamped by f0^2 = f^2 + 1/(2 pi tau)^2 with the trial's decay time tau, or with the mean of the
// others' where it read none: a series loss makes tau = 2 L/r whatever the capacitance. The probe's capacitance
// counts as added.
//
// It is the picture of the fit and its start. Fit says more: it uses every reading of every trial, and counts a part
// that served twice once.
func FitLine(trials []Trial) (*SubstitutionLine, error) {
	line := linePoints(trials)
	if err := line.enough(); err != nil {
		return nil, fmt.Errorf("fitting the substitution line: %w", err)
	}
	if err := line.fit(); err != nil {
		return nil, fmt.Errorf("fitting the substitution line: %w", err)
	}
	return line, nil
}

// linePoints are the points of the line, not yet fitted.
func linePoints(trials []Trial) *SubstitutionLine {
	line := &SubstitutionLine{}
	rate, rateU := meanDecayRate(trials)
	for _, t := range trials {
		ring, ok := t.Reading(RingHz)
		if !ok || t.Struck != "" || (t.Network.Kind != Bare && t.Network.Kind != C) {
			continue
		}
		if ring.U == 0 {
			ring.U = unstatedRing * ring.Value
		}
		d, du := rate, rateU
		if decay, ok := t.Reading(DecayS); ok {
			d = 1 / decay.Value
			du = d * decayU(decay) / decay.Value
		}
		w := 2 * math.Pi * ring.Value
		w0 := w*w + d*d
		p := LinePoint{Trial: t.ID, Kind: t.Network.Kind, Inverse: 1 / w0}
		p.InverseU = math.Hypot(2*w*2*math.Pi*ring.U, 2*d*du) / (w0 * w0)
		p.AddedC, p.AddedU, _ = fittedC(t.Network)
		p.AddedC += t.ProbeC
		line.Points = append(line.Points, p)
	}
	return line
}

// enough says what is missing for a line.
func (s *SubstitutionLine) enough() error {
	switch n := len(s.Points); n {
	case 0:
		return errors.New("no trial in scope read a ring frequency with nothing or a capacitor alone fitted; take at least one bare trial and one with a known capacitor")
	case 1:
		return errors.New("only one trial in scope read a ring frequency with nothing or a capacitor alone fitted: one point makes no line; fit a known capacitor, about three times the node's capacitance, and read again")
	}
	low, high, bare := s.Points[0].AddedC, s.Points[0].AddedC, true
	for _, p := range s.Points {
		bare = bare && p.Kind == Bare
		low, high = math.Min(low, p.AddedC), math.Max(high, p.AddedC)
	}
	switch {
	case bare:
		return fmt.Errorf("all %d trials are bare: without a known capacitor inductance and capacitance cannot be told apart; fit one that brings the frequency down to about half", len(s.Points))
	case high-low <= 1e-6*high:
		return fmt.Errorf("all %d trials had the same capacitance, %s, across the node: a line needs two; read the bare node too, or fit another capacitor", len(s.Points), farads(high))
	}
	return nil
}

// fit is York's line with the capacitance along x.
func (s *SubstitutionLine) fit() error {
	n := len(s.Points)
	x, y, ux, uy := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for i, p := range s.Points {
		x[i], y[i], ux[i], uy[i] = p.AddedC, p.Inverse, p.AddedU, p.InverseU
	}
	l, err := leastsq.Line(x, y, ux, uy, nil)
	if err != nil {
		return err
	}
	s.Intercept, s.Slope = l.Intercept, l.Slope
	s.InterU, s.SlopeU, s.Cov = l.UIntercept, l.USlope, l.Cov
	s.Chi2, s.DOF = l.Chi2, l.Dof
	for i := range s.Points {
		p := &s.Points[i]
		p.Residual = p.Inverse - (s.Intercept + s.Slope*p.AddedC)
	}
	switch {
	case !(s.Slope > 0):
		return s.rising()
	case !(s.Intercept > 0):
		return fmt.Errorf("the line meets zero at %s of added capacitance: the loop's capacitance would be negative; a capacitor is mislabelled, a frequency misread (twice the ring, or the switching frequency), or the probe's capacitance overstated", farads(s.Intercept/s.Slope))
	}
	return nil
}

// rising names the two trials that contradict the resonance.
func (s *SubstitutionLine) rising() error {
	a, b := s.Points[0], s.Points[0]
	for _, p := range s.Points {
		if p.AddedC < a.AddedC {
			a = p
		}
		if p.AddedC > b.AddedC {
			b = p
		}
	}
	hz := func(p LinePoint) string {
		return quantity.Format(1/(2*math.Pi*math.Sqrt(p.Inverse)), quantity.Frequency, 4)
	}
	return fmt.Errorf("the frequency rises with added capacitance (%s with %s, %s with %s): no resonance does; check the capacitors' marking and whether the ring was read, not the switching frequency", hz(a), farads(a.AddedC), hz(b), farads(b.AddedC))
}

func decayU(r Reading) float64 {
	if r.U == 0 {
		return unstatedDecay * r.Value
	}
	return r.U
}

// meanDecayRate is the weighted mean of 1/tau over the trials that fitted nothing or a capacitor alone and read a
// decay, 1/s; zero when none did.
func meanDecayRate(trials []Trial) (rate, u float64) {
	var sum, weight float64
	for _, t := range trials {
		d, ok := t.Reading(DecayS)
		if !ok || t.Struck != "" || (t.Network.Kind != Bare && t.Network.Kind != C) || !(d.Value > 0) {
			continue
		}
		r := 1 / d.Value
		ur := r * decayU(d) / d.Value
		sum += r / (ur * ur)
		weight += 1 / (ur * ur)
	}
	if weight == 0 {
		return 0, 0
	}
	return sum / weight, 1 / math.Sqrt(weight)
}

// without is the line's points but those set aside.
func (s *SubstitutionLine) without(list []SetAside) *SubstitutionLine {
	gone := map[string]bool{}
	for _, a := range list {
		gone[a.Trial] = true
	}
	kept := s.Points[:0]
	for _, p := range s.Points {
		if !gone[p.Trial] {
			kept = append(kept, p)
		}
	}
	s.Points = kept
	return s
}

func farads(c float64) string { return quantity.Format(c, quantity.Capacitance, 3) }
