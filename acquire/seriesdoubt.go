package acquire

import (
	"fmt"
	"math"

	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

const (
	// materialRing is how far, relatively, a ring must lie from what the fit predicts to be asked about: a mislabelled
	// capacitor is farther off.
	materialRing = 0.015

	// doubtful is how many standard uncertainties beyond the part's tolerance a reading must lie: one in a hundred sound
	// readings does (normal distribution, two-sided).
	doubtful = 2.576
)

// doubt says why a trial disagrees with the others; "" when it does not. before is the fit without it, after the one with it;
// either may be nil.
func doubt(before, after *snubber.FitResult, t snubber.Trial) string {
	if before != nil {
		if why := unforeseen(before, t); why != "" {
			return why
		}
	}
	if after != nil {
		for _, a := range after.SetAside {
			if a.Trial == t.ID {
				return a.Because
			}
		}
	}
	return ""
}

// unforeseen compares the ring of a trial with the prediction of a fit. With T = sqrt(L C), Z0 = sqrt(L/C) and the added
// capacitance Ca,
//
//	f = 1/(2 pi sqrt(L (C + Ca)))
//	d ln f = -(2C + Ca)/(2(C + Ca)) d ln T - Ca/(2(C + Ca)) (d ln Z0 + d ln Ca)
//
// whose variance is by GUM 5.2, with the correlation of T and Z0 that the fit has. The capacitor's tolerance is a bound and so
// no part of it: what lies beyond the bound has to be explained by the rest.
func unforeseen(f *snubber.FitResult, t snubber.Trial) string {
	ring, ok := t.Reading(snubber.RingHz)
	n := t.Network
	if !ok || n.Kind != snubber.Bare && n.Kind != snubber.C || f.Loop.Inductance == nil || f.Loop.Impedance == nil || f.Loop.RingHz == nil {
		return ""
	}
	added, uAdded, bound := n.C, 0.0, n.CTol
	if n.MeasuredC > 0 {
		added = n.MeasuredC
		if n.MeasuredU > 0 {
			uAdded, bound = n.MeasuredU/n.MeasuredC, 0
		}
	}
	if n.Kind == snubber.C && bound == 0 && uAdded == 0 {
		bound = f.UsualTolerance()
	}
	l := f.Nominal().WithProbe(t.ProbeC)
	n.C = added
	r, err := snubber.Respond(l, n, snubber.Excitation{Bus: 1})
	if err != nil {
		return ""
	}
	predicted, rings := r.RingHz()
	if !rings {
		return ""
	}
	byT := (2*l.Capacitance + added) / (2 * (l.Capacitance + added))
	byZ := added / (2 * (l.Capacitance + added))
	uT, uZ := f.Loop.RingHz.U/f.Loop.RingHz.Value, f.Loop.Impedance.U/f.Loop.Impedance.Value
	variance := byT*byT*uT*uT + byZ*byZ*(uZ*uZ+uAdded*uAdded) + 2*byT*byZ*timeWithImpedance(f)*uT*uZ
	own := ring.U / ring.Value
	if own == 0 {
		own = 0.005 // as the fit takes it where none is stated
	}
	u := math.Sqrt(math.Max(variance, 0) + own*own)
	off := math.Abs(math.Log(ring.Value / predicted))
	material := materialRing
	if len(f.Effects) > 0 {
		material *= 3 // of these the prediction knows nothing
	}
	if off < material || off-byZ*bound <= doubtful*u {
		return ""
	}
	why := fmt.Sprintf("it rings at %s where the other trials predict %s", quantity.Format(ring.Value, quantity.Frequency, 4), quantity.Format(predicted, quantity.Frequency, 4))
	if n.Kind == snubber.C {
		if c := explains(l, ring.Value); c > 0.01*l.Capacitance {
			return why + ", which " + quantity.Format(c, quantity.Capacitance, 3) + " would explain"
		}
		return why + ", as if there were no capacitor at all"
	}
	return why
}

// timeWithImpedance is the correlation of T = sqrt(L C) and Z0 in a fit; the ring's frequency is that of 1/T.
func timeWithImpedance(f *snubber.FitResult) float64 {
	c := f.Correlation
	if c == nil {
		return 0
	}
	z, hz := -1, -1
	for i, name := range c.Of {
		switch name {
		case "impedance_ohm":
			z = i
		case "ring_hz":
			hz = i
		}
	}
	if z < 0 || hz < 0 {
		return 0
	}
	return -c.R[z][hz]
}

// explains is the capacitance, F, that added to the loop makes it ring at hz; not positive where none does.
func explains(l snubber.Loop, hz float64) float64 {
	w, d := 2*math.Pi*hz, l.Resistance/(2*l.Inductance)
	return 1/((w*w+d*d)*l.Inductance) - l.Capacitance
}
