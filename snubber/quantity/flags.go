package quantity

import (
	"fmt"
	"math"
)

// The quantities below are flag values: Set reads by the grammar of Parse and then insists on sense, String
// writes what Set reads back exactly, and Type is the unit that a help text shows. Where zero makes no sense
// the zero value means "not given" and its String is empty; otherwise it is "0". Help texts take either for "no
// default".
//
// The bounds are this trade's, set wide, and from no standard: they catch a prefix that was forgotten or written
// with the wrong capital.

// Farad is a capacitance: 0 (none fitted), or 1 fF to 1 F.
type Farad float64

// Henry is an inductance: 1 pH to 1 H.
type Henry float64

// Ohm is a resistance: 0 (a link), or 1 uohm to 1 Gohm.
type Ohm float64

// Volt is a voltage of a bus or across a switch: 0, or 1 uV to 1 MV.
type Volt float64

// Ampere is a current of a load or a supply: 0, or 1 nA to 1 MA.
type Ampere float64

// Hertz is a frequency: 1 Hz to 100 GHz.
type Hertz float64

// Second is the time of a decay, an edge or a wait: 1 fs to 100 ks.
type Second float64

// Watt is a power turned to heat: 0, or 1 nW to 100 MW.
type Watt float64

// sense is what a flag value insists on beyond the grammar.
type sense struct {
	unit      Unit
	low, high float64 // SI unit
	zero      bool    // zero is allowed beside low to high
}

var (
	saneFarad  = sense{Capacitance, 1e-15, 1, true}
	saneHenry  = sense{Inductance, 1e-12, 1, false}
	saneOhm    = sense{Resistance, 1e-6, 1e9, true}
	saneVolt   = sense{Voltage, 1e-6, 1e6, true}
	saneAmpere = sense{Current, 1e-9, 1e6, true}
	saneHertz  = sense{Frequency, 1, 100e9, false}
	saneSecond = sense{Time, 1e-15, 100e3, false}
	saneWatt   = sense{Power, 1e-9, 100e6, true}
)

// read parses s and refuses a value without sense.
func (b *sense) read(s string) (float64, error) {
	v, err := Parse(s, b.unit)
	if err != nil {
		return 0, err
	}
	what := b.unit.Quantity()
	switch {
	case v == 0 && !b.zero:
		return 0, refuse(s, b.unit, what+" of zero makes no sense here")
	case v == 0:
		return 0, nil
	case v < 0:
		return 0, refuse(s, b.unit, what+" cannot be negative here")
	case v < b.low || v > b.high:
		return 0, refuse(s, b.unit, fmt.Sprintf("that is %s, and %s here lies between %s and %s; check the prefix",
			Format(v, b.unit, 0), what, Format(b.low, b.unit, 0), Format(b.high, b.unit, 0)))
	}
	return v, nil
}

// show is the String of a flag value.
func (b *sense) show(v float64) string {
	switch {
	case v == 0 && b.zero:
		return "0"
	case v == 0 || math.IsNaN(v):
		return ""
	}
	return Format(v, b.unit, 0)
}
