package snubber_test

import (
	"encoding/json"
	"errors"
	"math"
	"strings"
	"testing"

	"ringbook/snubber"
)

var (
	ratedLoop = snubber.Loop{Inductance: 20e-9, Capacitance: 200e-12, Resistance: 0.4}
	ratedAt   = snubber.Excitation{Bus: 100, Current: 6}
)

func ratings(t *testing.T, n snubber.Network, c snubber.Cycle, ambientC float64) snubber.Ratings {
	t.Helper()
	r, err := snubber.RatingsOf(ratedLoop, n, ratedAt, c, ambientC)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// The stresses beside the waveforms of Respond, sampled finely, and the discharge at turn-on, which is an RC's.
func TestRatingsAreTheWaveforms(t *testing.T) {
	for _, n := range []snubber.Network{{Kind: snubber.RC, R: 10, C: 1e-9}, {Kind: snubber.RC, R: 1.5, C: 470e-12, ESR: 0.5}, {Kind: snubber.RC, R: 200, C: 1e-9}} {
		c := snubber.Cycle{Hz: 2e5, SwitchOhm: 0.5}
		got := ratings(t, n, c, 25)
		resp, err := snubber.Respond(ratedLoop, n, ratedAt)
		if err != nil {
			t.Fatal(err)
		}
		h := 2e-12
		amps, volts, i2t := 0.0, 0.0, 0.0
		for at := 0.0; at < 4e-6; at += h {
			i := (resp.NodeAt(at) - resp.CapacitorAt(at)) / n.SeriesOhm()
			amps, volts, i2t = math.Max(amps, math.Abs(i)), math.Max(volts, resp.CapacitorAt(at)), i2t+i*i*h
		}
		on := 100 / (n.SeriesOhm() + 0.5)
		near(t, "resistor's peak current", got.ResistorPeakA, math.Max(amps, on), 1e-5)
		near(t, "resistor's peak voltage", got.ResistorPeakV, n.R*math.Max(amps, on), 1e-5)
		near(t, "capacitor's voltage", got.CapacitorV, math.Max(volts, 100), 1e-5)
		near(t, "capacitor's dv/dt", got.CapacitorVPerS, math.Max(amps, on)/n.C, 1e-5)
		// The discharge: i^2 integrates to E^2 Cs/2/(Rs + Ron), but for what the node's own charge sends through the network.
		near(t, "capacitor's RMS current", got.CapacitorRMSA, math.Sqrt(2e5*(i2t+100*100*n.C/2/(n.SeriesOhm()+0.5))), 2e-2)
		w, err := snubber.EnergyOf(ratedLoop, n, ratedAt, c)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "mean power", got.ResistorMeanW, 2e5*(w.Off.Resistor+w.On.Resistor), 1e-12)
		near(t, "RMS current's loss", got.CapacitorRMSA*got.CapacitorRMSA*n.R, got.ResistorMeanW, 1e-6)
		near(t, "pulse", got.PulseJ, math.Max(w.Off.Resistor, w.On.Resistor), 1e-12)
	}
}

// Full to 70 degC, 64.7 % at 100 degC, 35.3 % at 125 degC, nothing at 155 degC: common practice.
func TestResistorDerating(t *testing.T) {
	n := snubber.Network{Kind: snubber.RC, R: 10, C: 1e-9}
	loss := ratings(t, n, snubber.Cycle{Hz: 1}, 25).ResistorMeanW
	// 10 W beyond the largest of the series, so that the rating is twice the loss over what is left.
	c := snubber.Cycle{Hz: 100 / loss}
	for _, x := range []struct{ ambient, left float64 }{{-40, 1}, {70, 1}, {100, 0.647059}, {125, 0.352941}, {154, 1. / 85}} {
		near(t, "power to buy", ratings(t, n, c, x.ambient).ResistorW, 200/x.left, 1e-6)
	}
	for _, hot := range []float64{155, 300, math.NaN(), -300} {
		if _, err := snubber.RatingsOf(ratedLoop, n, ratedAt, c, hot); err == nil {
			t.Errorf("%g degC: no error", hot)
		}
	}
	for _, x := range []struct{ loss, buy float64 }{{0.01, 0.0625}, {0.05, 0.1}, {0.06, 0.125}, {0.4, 1}, {4, 10}} {
		near(t, "standard power", ratings(t, n, snubber.Cycle{Hz: x.loss / loss}, 25).ResistorW, x.buy, 0)
	}
}

// What the derivations in RatingsOf's documentation say, each from the other side.
func TestWhatSpoilsParts(t *testing.T) {
	n := snubber.Network{Kind: snubber.RCD, R: 10, C: 1e-9}
	r := ratings(t, n, snubber.Cycle{Hz: 2e5}, 25)
	f0 := ratedLoop.NaturalHz()
	near(t, "phase of the resistor", math.Tan(5.7105931*math.Pi/180), 2*math.Pi*f0*r.ResistorH/n.R, 1e-6)
	near(t, "self-resonance over the ring", 1/(2*math.Pi*math.Sqrt(r.LeadH*n.C))/f0, math.Sqrt(10), 1e-12)
	near(t, "lead at 1 nH a mm", r.LeadM*1e3, r.LeadH*1e9, 1e-12)
	fitted := ratedLoop.WithProbe(n.C) // the network's capacitor added to the node's
	near(t, "recovery", r.DiodeRecoveryS*fitted.NaturalHz(), 0.1, 1e-12)
	if !(r.DiodePeakA >= 6*n.C/(n.C+ratedLoop.Capacitance)) || !(r.DiodeV >= 100) {
		t.Errorf("diode of %g A and %g V", r.DiodePeakA, r.DiodeV)
	}
	if !(r.CapacitorBuyV >= 1.5*r.CapacitorV) || r.CapacitorBuyV > 4*r.CapacitorV {
		t.Errorf("a capacitor of %g V for %g V", r.CapacitorBuyV, r.CapacitorV)
	}
}

func TestAdvice(t *testing.T) {
	has := func(r snubber.Ratings, want bool, words ...string) {
		t.Helper()
		all := strings.Join(r.Advice, "\n")
		for _, w := range words {
			if strings.Contains(all, w) != want {
				t.Errorf("advice has %q: %v, in\n%s", w, !want, all)
			}
		}
	}
	c := snubber.Cycle{Hz: 2e5}
	rc := ratings(t, snubber.Network{Kind: snubber.RC, R: 10, C: 1e-9}, c, 25)
	has(rc, true, "non-inductive", "wirewound", "C0G", "X7R", "1 nH a millimetre", "hot", "discharge it", "licensed practice")
	has(rc, false, "diode", "switch alone", "degC")
	rcd := ratings(t, snubber.Network{Kind: snubber.RCD, R: 10, C: 1e-9}, c, 100)
	has(rcd, true, "diode must recover", "65 %")
	alone := ratings(t, snubber.Network{Kind: snubber.C, C: 1e-9}, c, 25)
	has(alone, true, "switch alone", "C0G")
	has(alone, false, "wirewound", "hot")
	for _, s := range rc.Advice {
		if !strings.HasSuffix(s, ".") || strings.Contains(s, "%!") || strings.Contains(s, ". ") {
			t.Errorf("not one sentence: %q", s)
		}
	}
}

// Finite figures, which JSON can hold, or an error, over the extremes.
func TestRatingsExtremes(t *testing.T) {
	lossless := snubber.Loop{Inductance: 20e-9, Capacitance: 200e-12}
	for _, x := range []struct {
		l snubber.Loop
		n snubber.Network
		e snubber.Excitation
		c snubber.Cycle
	}{
		{ratedLoop, snubber.Network{Kind: snubber.Bare}, ratedAt, snubber.Cycle{Hz: 1e5}},
		{ratedLoop, snubber.Network{Kind: snubber.C, C: 1e-9}, ratedAt, snubber.Cycle{Hz: 1e5}},
		{ratedLoop, snubber.Network{Kind: snubber.C, C: 1e-9}, ratedAt, snubber.Cycle{Hz: 1e5, SwitchOhm: 0.01}},
		{ratedLoop, snubber.Network{Kind: snubber.RC, R: 10, C: 1e-9}, snubber.Excitation{}, snubber.Cycle{}},
		{lossless, snubber.Network{Kind: snubber.RC, R: 10, C: 1e-9}, snubber.Excitation{Bus: 10e3, Current: 1e3}, snubber.Cycle{Hz: 1e9}},
		{lossless, snubber.Network{Kind: snubber.RCD, R: 10, C: 1e-9, DiodeDrop: 0.7}, snubber.Excitation{Bus: 10e3, Current: 100}, snubber.Cycle{Hz: 1e5}},
	} {
		r, err := snubber.RatingsOf(x.l, x.n, x.e, x.c, 40)
		if err != nil {
			t.Errorf("%+v: %v", x, err)
			continue
		}
		if _, err := json.Marshal(r); err != nil {
			t.Errorf("%+v: %v", x, err)
		}
	}
	if _, err := snubber.RatingsOf(lossless, snubber.Network{Kind: snubber.C, C: 1e-9}, ratedAt, snubber.Cycle{Hz: 1e5}, 40); !errors.Is(err, snubber.ErrNeverSettles) {
		t.Errorf("nothing damps: %v", err)
	}
}
