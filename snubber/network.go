package snubber

import (
	"fmt"
	"math"
)

// Kind says what is fitted across the switch.
type Kind string

// The kinds of network.
const (
	Bare Kind = "bare" // nothing
	C    Kind = "c"    // a capacitor alone
	RC   Kind = "rc"   // a resistor and a capacitor in series
	RCD  Kind = "rcd"  // the same with a diode across the resistor
)

// ParseKind reads a network's name as the CSV and the flags write it.
func ParseKind(s string) (Kind, error) {
	switch k := Kind(s); k {
	case Bare, C, RC, RCD:
		return k, nil
	}
	return "", fmt.Errorf("network %q: it must be one of bare, c, rc, rcd", s)
}

// HasC says whether a network of this kind has a capacitor.
func (k Kind) HasC() bool { return k == C || k == RC || k == RCD }

// HasR says whether a network of this kind has a resistor.
func (k Kind) HasR() bool { return k == RC || k == RCD }

// Network is what is fitted across the switch. Fields that its kind does not have are zero.
type Network struct {
	Kind      Kind
	C         float64 // F, > 0 for c, rc and rcd
	CTol      float64 // bound of the capacitor's error as a fraction of C; 0: not stated
	R         float64 // ohm, >= 0 for rc and rcd
	RTol      float64 // bound of the resistor's error as a fraction of R; 0: not stated
	ESR       float64 // ohm, >= 0: the capacitor's equivalent series resistance; 0: none
	MeasuredC float64 // F: the capacitor as measured on a meter; 0: not measured
	MeasuredU float64 // F: standard uncertainty of MeasuredC

	// TurnOff takes these in; Respond, of ideal parts, leaves them out.
	RInductance float64 // H, >= 0 for rc and rcd: the resistor's own, in series with R; 0: a non-inductive resistor
	DiodeDrop   float64 // V, >= 0 for rcd: the diode's forward voltage at no current; 0: none
	DiodeOhm    float64 // ohm, >= 0 for rcd: the diode's on-resistance; 0: none, the diode holds its drop at any current
}

// SeriesOhm is all the resistance in series with the network's capacitor, ohm.
func (n Network) SeriesOhm() float64 { return n.R + n.ESR }

// Check reports the first value that a network of its kind cannot have.
func (n Network) Check() error {
	if _, err := ParseKind(string(n.Kind)); err != nil {
		return err
	}
	switch {
	case n.Kind.HasC() && (!(n.C > 0) || math.IsInf(n.C, 0)):
		return fmt.Errorf("network %s with c = %g F: it needs a positive capacitance", n.Kind, n.C)
	case !n.Kind.HasC() && n.C != 0:
		return fmt.Errorf("network %s with c = %g F: it has no capacitor; leave c empty or name the network c, rc or rcd", n.Kind, n.C)
	case n.Kind.HasR() && (!(n.R > 0) || math.IsInf(n.R, 0)):
		return fmt.Errorf("network %s with r = %g ohm: it needs a positive resistance", n.Kind, n.R)
	case !n.Kind.HasR() && n.R != 0:
		return fmt.Errorf("network %s with r = %g ohm: it has no resistor; leave r empty or name the network rc or rcd", n.Kind, n.R)
	case !(n.CTol >= 0 && n.CTol < 1):
		return fmt.Errorf("c_tol = %g: a tolerance is a fraction from 0 to 1, such as 0.05 or 5%%", n.CTol)
	case !(n.RTol >= 0 && n.RTol < 1):
		return fmt.Errorf("r_tol = %g: a tolerance is a fraction from 0 to 1, such as 0.05 or 5%%", n.RTol)
	case !(n.ESR >= 0) || math.IsInf(n.ESR, 0):
		return fmt.Errorf("esr = %g ohm: it must be zero or a positive, finite number", n.ESR)
	}
	for _, x := range []struct {
		what, unit string
		value      float64
		has        bool
	}{
		{"inductance of the resistor", "H", n.RInductance, n.Kind.HasR()},
		{"diode drop", "V", n.DiodeDrop, n.Kind == RCD},
		{"diode on-resistance", "ohm", n.DiodeOhm, n.Kind == RCD},
	} {
		switch {
		case !(x.value >= 0) || math.IsInf(x.value, 0):
			return fmt.Errorf("%s %g %s: it must be zero or a positive, finite number", x.what, x.value, x.unit)
		case x.value != 0 && !x.has:
			return fmt.Errorf("network %s with a %s of %g %s: it has no such part; leave it zero", n.Kind, x.what, x.value, x.unit)
		}
	}
	return nil
}
