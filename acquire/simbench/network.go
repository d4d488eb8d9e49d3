package simbench

import (
	"fmt"
	"hash/fnv"
	"math"
	"math/rand/v2"
)

// Kind says what is fitted across the switch.
type Kind string

// The kinds of network.
const (
	Bare Kind = "bare" // nothing
	C    Kind = "c"    // a capacitor
	RC   Kind = "rc"   // a resistor and a capacitor in series
	RCD  Kind = "rcd"  // the same with a diode across the resistor, which conducts towards the capacitor
)

// Network is what is fitted, by the values printed on the parts.
type Network struct {
	Kind Kind
	C    float64 // F, > 0; 0 for bare
	R    float64 // ohm, > 0; 0 for bare and c
}

// Bounds that keep an integration short: a capacitor far larger than any that damps a ring, and a diode stiffer
// than any there is.
const (
	mostFarads    = 1e-6
	leastDiodeOhm = 0.01
)

// Check reports the first value that a network of its kind cannot have.
func (n Network) Check() error {
	var hasC, hasR bool
	switch n.Kind {
	case Bare:
	case C:
		hasC = true
	case RC, RCD:
		hasC, hasR = true, true
	default:
		return fmt.Errorf("network %q: it must be one of bare, c, rc, rcd", n.Kind)
	}
	switch {
	case hasC && !positive(n.C):
		return fmt.Errorf("network %s with %g F: it needs a positive capacitance", n.Kind, n.C)
	case hasC && n.C > mostFarads:
		return fmt.Errorf("network %s with %g F: the bench takes capacitors up to %g F", n.Kind, n.C, mostFarads)
	case hasR && !positive(n.R):
		return fmt.Errorf("network %s with %g ohm: it needs a positive resistance", n.Kind, n.R)
	case !hasC && n.C != 0:
		return fmt.Errorf("network %s with %g F: it has no capacitor", n.Kind, n.C)
	case !hasR && n.R != 0:
		return fmt.Errorf("network %s with %g ohm: it has no resistor", n.Kind, n.R)
	}
	return nil
}

// Parts says how far the parts on hand are from what is printed on them.
type Parts struct {
	CTol      float64 // bound of a capacitor's error, a fraction, in [0, 1)
	RTol      float64 // the same for a resistor
	ESR       float64 // ohm, >= 0: the capacitors' series resistance
	DiodeDrop float64 // V, >= 0: forward drop of the diode in an RCD network
	DiodeOhm  float64 // ohm, >= 0.01: its on-resistance
	Seed      uint64  // which box of parts: the same nominal value from it is the same part
}

func (p Parts) check() error {
	switch {
	case !(p.CTol >= 0 && p.CTol < 1), !(p.RTol >= 0 && p.RTol < 1):
		return fmt.Errorf("tolerances %g of capacitors and %g of resistors: each is a fraction from 0 to 1", p.CTol, p.RTol)
	case !notNegative(p.ESR):
		return fmt.Errorf("capacitor series resistance %g ohm: it must be zero or positive, and finite", p.ESR)
	case !notNegative(p.DiodeDrop), !(p.DiodeOhm >= leastDiodeOhm), math.IsInf(p.DiodeOhm, 0):
		return fmt.Errorf("network diode of %g V and %g ohm: the drop may not be negative nor the resistance below %g ohm", p.DiodeDrop, p.DiodeOhm, leastDiodeOhm)
	}
	return nil
}

// actual is the network with the values its parts really have: each off by an error drawn evenly from
// its tolerance, always the same for the same nominal value.
func (p Parts) actual(n Network) Network {
	n.C *= 1 + p.CTol*p.draw("C", n.C)
	n.R *= 1 + p.RTol*p.draw("R", n.R)
	return n
}

// draw is a number in [-1, 1) that depends on the box, the sort of part and its nominal value alone.
func (p Parts) draw(sort string, nominal float64) float64 {
	h := fnv.New64a()
	fmt.Fprintf(h, "%s %.6g", sort, nominal)
	return 2*rand.New(rand.NewPCG(p.Seed, h.Sum64())).Float64() - 1
}
