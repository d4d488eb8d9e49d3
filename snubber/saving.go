package snubber

import (
	"fmt"
	"math"
)

// Saving is what a capacitor across the switch does to the switch's own turn-off loss.
type Saving struct {
	Ratio   float64 // Cs over Cs1 = I0 tf/(2 E), with which the node reaches the bus just as the current is gone
	Without float64 // J, each turn-off, in the switch without the capacitor: E I0 tf/2
	With    float64 // J, each turn-off, in the switch with it
	Saved   float64 // J: Without - With
	Stored  float64 // J: Cs E^2/2, lost in the resistor (or the switch) at the next turn-on
	Total   float64 // J: With + Stored
	LeastC  float64 // F: the capacitor of the least Total, 4/9 of Cs1; Total is then 5/9 of Without
}

// TurnOffSaving is the textbook's turn-off snubber: capacitor c (F) straight across the switch, or through a diode;
// a switch current that falls linearly from e.Current to zero in fallS seconds; and a load that holds its current
// while the node rises, clamped at the bus. The capacitor takes the difference of the two. With k = c/Cs1, in units of
// E I0 tf/2,
//
//	With = 1 - (4/3) sqrt(k) + k/2, k <= 1      With = 1/(6 k), k >= 1      Stored = k/2
//
// N. Mohan, T. Undeland and W. Robbins, Power Electronics, chapter on snubber circuits; W. McMurray, IEEE Trans. Ind.
// Appl. IA-16 (1980), for 4/9 and 5/9: attributions from memory, the formulas derived and integrated here.
//
// A resistor in series without a diode takes the current's step first, I0 R at once, and spares the switch less.
func TurnOffSaving(c float64, e Excitation, fallS float64) (Saving, error) {
	switch {
	case !(c >= 0) || math.IsInf(c, 0):
		return Saving{}, fmt.Errorf("capacitor of %g F: it must be zero or a positive, finite number", c)
	case !(e.Bus > 0) || math.IsInf(e.Bus, 0):
		return Saving{}, fmt.Errorf("bus voltage %g V: it must be a positive, finite number", e.Bus)
	case !(e.Current > 0) || math.IsInf(e.Current, 0):
		return Saving{}, fmt.Errorf("current %g A at turn-off: it must be a positive, finite number", e.Current)
	case !(fallS > 0) || math.IsInf(fallS, 0):
		return Saving{}, fmt.Errorf("fall time %g s: it must be a positive, finite number", fallS)
	}
	full := e.Current * fallS / (2 * e.Bus)
	s := Saving{Ratio: c / full, Without: overlap(0, e, fallS), With: overlap(c, e, fallS), Stored: c * e.Bus * e.Bus / 2, LeastC: full * 4 / 9}
	s.Saved = s.Without - s.With
	s.Total = s.With + s.Stored
	return s, nil
}

// overlap is the switch's loss at one turn-off with a capacitor c across it, J.
func overlap(c float64, e Excitation, fallS float64) float64 {
	w := e.Bus * e.Current * fallS / 2
	if w == 0 {
		return 0
	}
	k := 2 * c * e.Bus / (e.Current * fallS)
	if k <= 1 {
		return w * (1 - 4./3*math.Sqrt(k) + k/2)
	}
	return w / (6 * k)
}
