package snubber_test

import (
	"math"
	"testing"

	"ringbook/snubber"
)

// The probe's capacitance is on the node while the peak is read: a reading exact but for it agrees, and what is off is
// explained by the current or the inductance that made it.
func TestConfirm(t *testing.T) {
	loop, e := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}, snubber.Excitation{Bus: 48, Current: 4}
	for _, n := range []snubber.Network{
		{Kind: snubber.C, C: 470e-12},
		{Kind: snubber.RC, C: 330e-12, R: 9.1},
		{Kind: snubber.RCD, C: 330e-12, R: 22, DiodeDrop: 0.8, DiodeOhm: 0.1},
	} {
		peak := func(l snubber.Loop, e snubber.Excitation) float64 {
			turn, err := snubber.TurnOff(l, n, e)
			if err != nil {
				t.Fatal(err)
			}
			return turn.Peak.Volts
		}
		said := snubber.Prediction{Network: n, Loop: loop, Excitation: e, LimitV: 90,
			Peak: snubber.Estimate{Value: peak(loop, e), U: 0.01}}
		confirm := func(l snubber.Loop, e snubber.Excitation) *snubber.Confirmation {
			const probe = 12e-12
			l.Capacitance += probe
			c, err := said.Confirm([]snubber.Trial{{ID: "one", Network: n, ProbeC: probe,
				Readings: []snubber.Reading{{Quantity: snubber.PeakV, Value: peak(l, e), U: 0.01}}}})
			if err != nil {
				t.Fatal(err)
			}
			return c
		}
		c := confirm(loop, e)
		if !c.Agrees || math.Abs(c.OffV) > 1e-9 || math.Abs(c.ProbeV) < 0.02 || c.CurrentA != 0 || c.InductanceH != 0 {
			t.Errorf("%s: %+v", n.Kind, c)
		}
		more := e
		more.Current *= 1.3
		if c := confirm(loop, more); c.Agrees || math.Abs(c.CurrentA/more.Current-1) > 0.01 {
			t.Errorf("%s with %g A: %+v", n.Kind, more.Current, c)
		}
		longer := loop
		longer.Inductance *= 0.7
		if c := confirm(longer, e); c.Agrees || math.Abs(c.InductanceH/longer.Inductance-1) > 0.05 {
			t.Errorf("%s with %g H: %+v", n.Kind, longer.Inductance, c)
		}
	}
}
