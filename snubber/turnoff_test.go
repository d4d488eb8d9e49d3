package snubber_test

import (
	"errors"
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"ringbook/snubber"
)

// edge draws a circuit of any kind, with or without each part that may be zero.
func edge(t *rapid.T) (snubber.Loop, snubber.Network, snubber.Excitation) {
	l, n, e := circuit(t)
	z := l.Impedance()
	some := func(name string, lo, hi, scale float64) float64 {
		if rapid.Bool().Draw(t, "no "+name) {
			return 0
		}
		return scale * math.Exp(rapid.Float64Range(math.Log(lo), math.Log(hi)).Draw(t, name))
	}
	n.Kind = rapid.SampledFrom([]snubber.Kind{snubber.Bare, snubber.C, snubber.RC, snubber.RCD, snubber.RCD}).Draw(t, "kind")
	switch n.Kind {
	case snubber.Bare:
		n.C, n.R = 0, 0
	case snubber.C:
		n.R, n.ESR = 0, some("ESR", 1e-3, 1, z)
	default:
		n.ESR = some("ESR", 1e-3, 1, z)
		n.RInductance = some("RL", 1e-3, 3, l.Inductance)
	}
	if n.Kind == snubber.RCD {
		n.DiodeOhm = some("Rd", 1e-3, 1, z)
		n.DiodeDrop = some("drop", 1e-3, 0.3, e.Bus)
	}
	if l.Resistance == 0 && n.SeriesOhm() == 0 || n.Kind == snubber.RCD && l.Resistance < 0.01*z {
		l.Resistance = 0.01 * z // what hardly damps is refused, after many switchings of the diode
	}
	return l, n, e
}

func carried(l snubber.Loop, n snubber.Network, e snubber.Excitation, u snubber.Turn) float64 {
	return u.Source + l.Inductance*e.Current*e.Current/2 - (l.Capacitance+n.C)*e.Bus*e.Bus/2
}

// The energies of every circuit add up to what the source gave, each found from its own currents.
func TestTurnOffEnergiesAddUp(t *testing.T) {
	worst := 0.0
	rapid.Check(t, func(t *rapid.T) {
		l, n, e := edge(t)
		u, err := snubber.TurnOff(l, n, e)
		if err != nil {
			t.Fatalf("%+v %+v %+v: %v", l, n, e, err)
		}
		whole := (l.Capacitance+n.C)*e.Bus*e.Bus/2 + l.Inductance*e.Current*e.Current/2
		off := math.Abs(u.Energy.Total()-carried(l, n, e, u)) / whole
		worst = math.Max(worst, off)
		if !(off <= 1e-6) {
			t.Fatalf("%+v %+v %+v: energies %+v add up to %.9g J, the source and the current brought %.9g J (%.2g)",
				l, n, e, u.Energy, u.Energy.Total(), carried(l, n, e, u), off)
		}
		if off := math.Abs(u.Energy.Total()-whole) / whole; !(off <= 1e-6) {
			t.Fatalf("%+v %+v %+v: energies add up to %.9g J of %.9g J", l, n, e, u.Energy.Total(), whole)
		}
	})
	t.Logf("worst balance %.2g", worst)
}

// Every instant of every edge obeys the circuit's equations, of which the test has its own form: the charge of both capacitors,
// the loop's voltage, and a diode that either conducts above its drop or blocks below it. Nothing is above what Turn calls its
// peak.
func TestTurnOffObeysKirchhoff(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, n, e := edge(t)
		u, err := snubber.TurnOff(l, n, e)
		if err != nil {
			t.Fatalf("%+v %+v %+v: %v", l, n, e, err)
		}
		unit := math.Sqrt(l.Inductance * l.Capacitance)
		volts := u.Peak.Volts + e.Current*l.Impedance()
		over := func(what string, got, limit, scale float64) {
			t.Helper()
			if got > limit+1e-9*scale {
				t.Fatalf("%+v %+v %+v: %s %.12g, above %.12g", l, n, e, what, got, limit)
			}
		}
		for k := range 300 {
			at := unit * 0.07 * float64(k)
			over("node", u.NodeAt(at), u.Peak.Volts, volts)
			over("network current", math.Abs(u.NetworkCurrentAt(at)), u.CapacitorPeakA, u.CapacitorPeakA)
			over("resistor current", math.Abs(u.ResistorCurrentAt(at)), u.ResistorPeakA, u.ResistorPeakA)
			over("diode current", u.DiodeCurrentAt(at), u.DiodePeakA, u.DiodePeakA)
			over("voltage of a backward diode current", -u.DiodeCurrentAt(at)*(n.DiodeOhm+n.ESR), 0, 30*volts)
			if n.Kind != snubber.Bare {
				over("capacitor", u.CapacitorAt(at), u.CapacitorPeakV, volts)
			}
		}
		at := unit * rapid.Float64Range(0.01, 20).Draw(t, "tau")
		h := unit * 1e-4
		loopAmps, netAmps := u.LoopCurrentAt, u.NetworkCurrentAt
		// Over the interval from a to b the integral of a current, by Simpson's rule on a fine grid.
		mean := func(f func(float64) float64, a, b float64) float64 {
			const m = 64
			s := f(a) + f(b)
			for k := 1; k < m; k++ {
				s += f(a+(b-a)*float64(k)/m) * float64(2+2*(k%2))
			}
			return s / (3 * m)
		}
		amps := volts/l.Impedance() + u.CapacitorPeakA
		same := func(what string, got, want, scale float64) {
			t.Helper()
			if !(math.Abs(got-want) <= 1e-5*scale) {
				t.Fatalf("%+v %+v %+v at %g s: %s: %.9g, want %.9g (scale %g)", l, n, e, at, what, got, want, scale)
			}
		}
		b := at + h
		if (u.DiodeCurrentAt(at) == 0) != (u.DiodeCurrentAt(b) == 0) {
			return // the diode switches within, and the currents may jump, which no rule of Simpson's follows
		}
		same("C dv", l.Capacitance*(u.NodeAt(b)-u.NodeAt(at))/h, mean(loopAmps, at, b)-mean(netAmps, at, b), amps)
		same("L di", l.Inductance*(loopAmps(b)-loopAmps(at))/h,
			e.Bus-mean(u.NodeAt, at, b)-l.Resistance*mean(loopAmps, at, b), volts*(1+l.Resistance/l.Impedance()))
		if n.C > 0 {
			same("Cs du", n.C*(u.CapacitorAt(b)-u.CapacitorAt(at))/h, mean(netAmps, at, b), amps)
		}
		if n.Kind == snubber.RCD {
			i := u.DiodeCurrentAt(at)
			across := u.NodeAt(at) - u.CapacitorAt(at) - n.ESR*netAmps(at)
			drop := n.DiodeDrop + n.DiodeOhm*i
			if i > 1e-6*amps {
				same("conducting diode's voltage", across, drop, volts)
			} else {
				over("blocking diode's voltage", across, drop, 1e3*volts)
			}
			same("network current", netAmps(at), i+u.ResistorCurrentAt(at), amps)
		}
	})
}

// What is linear agrees with the closed form of Respond.
func TestTurnOffIsRespond(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, n, e := edge(t)
		if n.Kind == snubber.RCD {
			n.Kind, n.DiodeDrop, n.DiodeOhm = snubber.RC, 0, 0
		}
		n.RInductance = 0
		u, err := snubber.TurnOff(l, n, e)
		if err != nil {
			t.Fatal(err)
		}
		r, err := snubber.Respond(l, n, e)
		if err != nil {
			t.Fatal(err)
		}
		at := math.Sqrt(l.Inductance*l.Capacitance) * rapid.Float64Range(0, 30).Draw(t, "tau")
		scale := r.Peak().Volts + e.Current*l.Impedance()
		for _, x := range [][2]float64{{u.NodeAt(at), r.NodeAt(at)}, {u.CapacitorAt(at), r.CapacitorAt(at)},
			{u.LoopCurrentAt(at) * l.Impedance(), r.LoopCurrentAt(at) * l.Impedance()}} {
			if !(math.Abs(x[0]-x[1]) <= 2e-7*scale) {
				t.Fatalf("%+v %+v %+v: %.12g, Respond has %.12g", l, n, e, x[0], x[1])
			}
		}
		if p := r.Peak(); !(math.Abs(u.Peak.Volts-p.Volts) <= 2e-7*p.Volts) {
			t.Fatalf("%+v %+v %+v: peak %+v, Respond has %+v", l, n, e, u.Peak, p)
		}
	})
}

func TestTurnOffRefuses(t *testing.T) {
	l := snubber.Loop{Inductance: 1e-8, Capacitance: 1e-10, Resistance: 0.1}
	lossless := snubber.Loop{Inductance: 1e-8, Capacitance: 1e-10}
	e := snubber.Excitation{Bus: 48, Current: 1}
	rc := snubber.Network{Kind: snubber.RC, C: 1e-10, R: 10}
	for _, c := range []struct {
		want string
		l    snubber.Loop
		n    snubber.Network
		e    snubber.Excitation
	}{
		{"does not die away", lossless, snubber.Network{Kind: snubber.C, C: 1e-10}, e},
		{"no such part", l, snubber.Network{Kind: snubber.C, C: 1e-10, RInductance: 1e-9}, e},
		{"no such part", l, snubber.Network{Kind: snubber.RC, C: 1e-10, R: 1, DiodeDrop: 1}, e},
		{"no such part", l, snubber.Network{Kind: snubber.Bare, DiodeOhm: 1}, e},
		{"inductance of the resistor -1", l, snubber.Network{Kind: snubber.RC, C: 1e-10, R: 1, RInductance: -1}, e},
		{"diode drop NaN", l, snubber.Network{Kind: snubber.RCD, C: 1e-10, R: 1, DiodeDrop: math.NaN()}, e},
		{"diode on-resistance +Inf", l, snubber.Network{Kind: snubber.RCD, C: 1e-10, R: 1, DiodeOhm: math.Inf(1)}, e},
		{"bus voltage -1", l, rc, snubber.Excitation{Bus: -1}},
		{"loop current NaN", l, rc, snubber.Excitation{Bus: 1, Current: math.NaN()}},
		{"loop inductance 0", snubber.Loop{Capacitance: 1}, rc, e},
	} {
		_, err := snubber.TurnOff(c.l, c.n, c.e)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%+v %+v %+v: error %v, want one with %q", c.l, c.n, c.e, err, c.want)
		}
	}
	if _, err := snubber.TurnOff(lossless, snubber.Network{Kind: snubber.Bare}, e); !errors.Is(err, snubber.ErrNeverSettles) {
		t.Errorf("lossless bare node: %v", err)
	}
	if u, err := snubber.TurnOff(l, rc, snubber.Excitation{}); err != nil || u.Energy.Total() != 0 || u.Peak.Volts != 0 {
		t.Errorf("nothing to do: %+v, %v", u, err)
	}
}
