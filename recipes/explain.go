package recipes

import (
	"fmt"
	"strings"

	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"
)

// explain says what would account for a peak measured off the prediction by off volts: another loop current at turn-off,
// another loop inductance. It is "" where neither would alone, and for a network with a diode.
func explain(d store.Decision, off float64) string {
	if d.Network.Kind == snubber.RCD {
		return ""
	}
	current := d.Excitation.Current
	if current > 0 {
		current = solve(d, off, current, func(i float64) (snubber.Loop, snubber.Excitation) {
			return d.Loop, snubber.Excitation{Bus: d.Excitation.Bus, Current: i}
		})
	}
	inductance := solve(d, off, d.Loop.Inductance, func(l float64) (snubber.Loop, snubber.Excitation) {
		loop := d.Loop
		loop.Inductance = l
		return loop, d.Excitation
	})
	var causes []string
	for _, x := range []struct {
		what     string
		was, now float64
		unit     quantity.Unit
	}{
		{"a loop current at turn-off", d.Excitation.Current, current, quantity.Current},
		{"a loop inductance", d.Loop.Inductance, inductance, quantity.Inductance},
	} {
		if x.now > 0 {
			causes = append(causes, fmt.Sprintf("%s of %s instead of %s", x.what, quantity.Format(x.now, x.unit, 2), quantity.Format(x.was, x.unit, 2)))
		}
	}
	if len(causes) == 0 {
		return ""
	}
	return capital(strings.Join(causes, ", or ")) + " would explain it"
}

func capital(s string) string { return strings.ToUpper(s[:1]) + s[1:] }

// solve is the value of x, from a fifth to five times was, that moves the peak of the decision's network by off volts; 0
// where none does. The peak grows with the loop's current and inductance.
func solve(d store.Decision, off, was float64, with func(x float64) (snubber.Loop, snubber.Excitation)) float64 {
	peak := func(x float64) (float64, bool) {
		l, e := with(x)
		r, err := snubber.Respond(l, d.Network, e)
		if err != nil {
			return 0, false
		}
		return r.Peak().Volts, true
	}
	low, high := was/5, was*5
	at, ok := peak(was)
	least, okLow := peak(low)
	most, okHigh := peak(high)
	want := at + off
	if !ok || !okLow || !okHigh || want < least || want > most {
		return 0
	}
	for range 60 {
		mid := (low + high) / 2
		if v, _ := peak(mid); v < want {
			low = mid
		} else {
			high = mid
		}
	}
	return (low + high) / 2
}
