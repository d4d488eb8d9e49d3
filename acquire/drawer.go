package acquire

import (
	"fmt"
	"math"
	"strings"
	"time"

	"ringbook/acquire/scpi"
	"ringbook/snubber"
)

// Drawer is the parts on hand, as drawer.toml lists them. This file is complete:
//
//	[capacitor.C3]                     # the name is what is written on its bag; it goes into the logbook
//	value       = "470p"               # as printed on it
//	tolerance   = "5%"                 # a bound, as the maker states it
//	measured    = "463p"               # on a meter; left out where it was not
//	measured_u  = "2p"                 # standard uncertainty (k = 1) of that
//	measured_at = 2026-03-01           # when
//	dielectric  = "C0G"
//	instrument  = "relays"             # of the rig: the one that switches it in, where one does
//	switch      = "ROUTe:CLOSe (@3)"   # a message, or a list of them
//	unswitch    = "ROUTe:OPEN (@3)"
//
//	[resistor.R1]
//	value     = "4R7"
//	tolerance = "1%"
type Drawer struct {
	Capacitors []Part // by rising value, parts of one value by name
	Resistors  []Part // the same
}

// Part is one part of a drawer, or the next that is to be bought: then it has no name.
type Part struct {
	Name       string    // what is written on its bag
	Value      float64   // F or ohm, > 0: as printed on it
	Tol        float64   // bound of its error as a fraction, below 1; 0: not stated
	Measured   float64   // F or ohm; 0: not measured
	MeasuredU  float64   // standard uncertainty (k = 1) of Measured; 0: not stated
	MeasuredAt time.Time // zero: not stated
	Dielectric string

	Instrument       string   // the rig's name for what switches it in; "": a person does
	Switch, Unswitch []string // what is sent to it for that, and to take the part out again
}

// Switched says whether the part is switched in by command.
func (p Part) Switched() bool { return p.Instrument != "" }

// Network is the capacitor p alone across the switch.
func (p Part) Network() snubber.Network {
	return snubber.Network{Kind: snubber.C, C: p.Value, CTol: p.Tol, MeasuredC: p.Measured, MeasuredU: p.MeasuredU}
}

// Candidate is the capacitor p for the fit to consider; tol is its tolerance where none is stated.
func (p Part) Candidate(tol float64) snubber.Candidate {
	c := snubber.Candidate{C: p.Best(), CTol: tol, U: p.MeasuredU}
	if p.Tol > 0 {
		c.CTol = p.Tol
	}
	return c
}

// Best is the part's value as measured, or else as printed.
func (p Part) Best() float64 {
	if p.Measured > 0 {
		return p.Measured
	}
	return p.Value
}

// unlike is how far, relatively, a part may measure from what is printed on it. Beyond, a prefix was mistyped or it is another
// part; the widest tolerance in the trade is some -20 to +80 %.
const unlike = 0.8

// check gives the first of the part's figures that cannot be, by its key in the file.
func (p Part) check() (key string, err error) {
	for _, x := range []struct {
		key   string
		value float64
	}{{"value", p.Value}, {"tolerance", p.Tol}, {"measured", p.Measured}, {"measured_u", p.MeasuredU}} {
		if !(x.value >= 0) || math.IsInf(x.value, 0) {
			return x.key, fmt.Errorf("%g: it must be positive and finite", x.value)
		}
	}
	switch {
	case p.Value == 0:
		return "value", fmt.Errorf("0: no such part exists; give what is printed on it")
	case p.Tol >= 1:
		return "tolerance", fmt.Errorf("%g: a part of that tolerance may be nothing at all; write for example \"5%%\"", p.Tol)
	case p.Measured == 0 && p.MeasuredU > 0:
		return "measured_u", fmt.Errorf("an uncertainty without what was measured: give measured too")
	case p.Measured > 0 && math.Abs(p.Measured/p.Value-1) > unlike:
		return "measured", fmt.Errorf("%g where %g is printed on it: check the prefixes", p.Measured, p.Value)
	case p.Measured > 0 && p.MeasuredU > p.Measured:
		return "measured_u", fmt.Errorf("%g is more than was measured: check the prefix", p.MeasuredU)
	}
	return p.checkSwitch()
}

func (p Part) checkSwitch() (key string, err error) {
	if p.Instrument == "" && len(p.Switch)+len(p.Unswitch) == 0 {
		return "", nil
	}
	for _, x := range []struct {
		key      string
		messages []string
	}{{"switch", p.Switch}, {"unswitch", p.Unswitch}} {
		if len(x.messages) == 0 {
			return x.key, fmt.Errorf("it is missing: a part that is switched by command needs instrument, switch and unswitch")
		}
		for _, m := range x.messages {
			if _, _, err := scpi.ParseUnit(m); err != nil {
				return x.key, err
			}
		}
	}
	if p.Instrument == "" {
		return "instrument", fmt.Errorf("it is missing: name the instrument of the rig that is sent %q", strings.Join(p.Switch, "; "))
	}
	return "", nil
}
