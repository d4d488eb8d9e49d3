package simbench

import (
	"context"
	"math"
	"testing"
)

// hard is a board with everything on it: a capacitance that depends strongly on voltage, a slow fall, a
// body diode that conducts, and an RCD network with ESR.
func hard() circuit {
	b := Board{Inductance: 20e-9, Resistance: 0.2, FixedC: 50e-12, JunctionC: 600e-12, JunctionV: 3, Grading: 0.6,
		FallTime: 3e-9, BodyDrop: 0.8, BodyOhm: 0.05, PerLoadA: 1}
	p := Parts{ESR: 0.02, DiodeDrop: 0.7, DiodeOhm: 0.1}
	return newCircuit(b, p, Network{Kind: RCD, C: 300e-12, R: 40}, 30, 12, 4e-12)
}

// TestEnergyBalance: what the bus delivers is stored, or lost in a resistance, a diode or the falling
// switch. The integrals are Gauss's of five points over each step.
func TestEnergyBalance(t *testing.T) {
	points := [5]float64{-0.9061798459386640, -0.5384693101056831, 0, 0.5384693101056831, 0.9061798459386640}
	weights := [5]float64{0.2369268850561891, 0.4786286704993665, 0.5688888888888889, 0.4786286704993665, 0.2369268850561891}
	for _, c := range []struct {
		name string
		circ circuit
	}{
		{"rcd", hard()},
		{"rc", func() circuit { c := hard(); c.hasDiode = false; return c }()},
		{"bare", func() circuit { c := hard(); c.hasDiode, c.branchC = false, 0; return c }()},
	} {
		b := c.circ.board
		nodeEnergy := func(v float64) (w float64) { // integral of v C(v) from 0
			const parts = 2000
			for i := range parts {
				for k := range points {
					x := v * (float64(i) + (points[k]+1)/2) / parts
					w += v / parts / 2 * weights[k] * x * (b.CapacitanceAt(x) + c.circ.fixed)
				}
			}
			return w
		}
		stored := func(y state) float64 {
			return b.Inductance*y[0]*y[0]/2 + nodeEnergy(y[1]) + c.circ.branchC*y[2]*y[2]/2
		}
		var in, lost, inBody, inDiode float64
		last := c.circ.start()
		before := stored(last)
		if err := c.circ.integrate(context.Background(), 300e-9, 1e-10, func(s *step) {
			for k := range points {
				theta := (points[k] + 1) / 2
				y, w := s.at(theta), s.h/2*weights[k]
				body, branch := c.circ.bodyCurrent(y, s.mode), c.circ.branchCurrent(y, s.mode)
				in += w * c.circ.bus * y[0]
				lost += w * (b.Resistance*y[0]*y[0] + y[1]*c.circ.switchCurrent(s.t+theta*s.h) - y[1]*body + (y[1]-y[2])*branch)
			}
			if s.mode.body {
				inBody += s.h
			}
			if s.mode.network {
				inDiode += s.h
			}
			last = s.to
		}); err != nil {
			t.Fatal(err)
		}
		gap := (in + before - stored(last) - lost) / lost
		t.Logf("%s: %.4g J from the bus, %.4g J lost, gap %.1e; body diode %.3g s, network diode %.3g s", c.name, in, lost, gap, inBody, inDiode)
		if math.Abs(gap) > 1e-8 {
			t.Errorf("%s: the energies differ by %.1e of the loss", c.name, gap)
		}
		if c.name == "rcd" && inDiode == 0 || c.name == "bare" && inBody == 0 {
			t.Errorf("%s: the diode meant to be tried never conducted", c.name)
		}
	}
}

// TestPlainRungeKutta compares with the classical Runge-Kutta method at a small fixed step, written
// here, in which the diodes are kinks of the equations and nothing looks for their instants.
func TestPlainRungeKutta(t *testing.T) {
	c := hard()
	b := c.board
	f := func(t float64, y state) state {
		sw := 12 * max(0, 1-t/b.FallTime)
		// The voltage across the resistor, diode off and on; the ESR of 0.02 ohm carries what is left.
		onR := min((y[1]-y[2])/(1+0.02/40), (y[1]-y[2]+0.02*0.7/0.1)/(1+0.02/40+0.02/0.1))
		branch := (y[1] - y[2] - onR) / 0.02
		body := max(0, -0.8-y[1]) / 0.05
		node := 54e-12 + 600e-12*math.Pow(1+y[1]/3, -0.6)
		if y[1] < 0 {
			node = 54e-12 + 600e-12*(1-0.6*y[1]/3)
		}
		return state{(30 - y[1] - 0.2*y[0]) / 20e-9, (y[0] - sw + body - branch) / node, branch / 300e-12}
	}
	add := func(y, d state, h float64) state {
		return state{y[0] + h*d[0], y[1] + h*d[1], y[2] + h*d[2]}
	}
	const h, n = 0.5e-12, 120_000
	r := solved(t, c, h*n, 1e-10)
	y := state{12}
	worst := 0.0
	var got [1]float64
	for i := range n {
		at := float64(i) * h
		k1 := f(at, y)
		k2 := f(at+h/2, add(y, k1, h/2))
		k3 := f(at+h/2, add(y, k2, h/2))
		k4 := f(at+h, add(y, k3, h))
		for j := range y {
			y[j] += h / 6 * (k1[j] + 2*k2[j] + 2*k3[j] + k4[j])
		}
		if i%500 == 499 {
			r.sample(at+h, 1, got[:])
			worst = max(worst, math.Abs(got[0]-y[1]))
		}
	}
	t.Logf("largest difference %.1e V", worst)
	if worst > 1e-5 {
		t.Errorf("the two methods differ by %.1e V", worst)
	}
}

// TestNonlinearPeak: without loss and network the peak is where the energy has gone round once,
//
//	integral from 0 to peak of C(v) (v - E) dv = L I0^2 / 2
//
// which for grading 1/2 is a closed form, its root found here by bisection.
func TestNonlinearPeak(t *testing.T) {
	b := Board{Inductance: 12e-9, FixedC: 100e-12, JunctionC: 400e-12, JunctionV: 5, Grading: 0.5, PerLoadA: 1}
	const bus, current = 48, 4
	c := newCircuit(b, Parts{DiodeOhm: 1}, Network{Kind: Bare}, bus, current, 0)
	energy := func(v float64) float64 { // integral of v C(v) less E times that of C(v)
		s := math.Sqrt(1 + v/5)
		vc := 100e-12*v*v/2 + 400e-12*(2*25./3*(s*s*s-1)-2*25*(s-1))
		q := 100e-12*v + 400e-12*2*5*(s-1)
		return vc - bus*q - 12e-9*current*current/2
	}
	low, high := float64(bus), 1000.
	for range 100 {
		if mid := (low + high) / 2; energy(mid) < 0 {
			low = mid
		} else {
			high = mid
		}
	}
	got := solved(t, c, 100e-9, 1e-11).peak.Peak
	if math.Abs(got/low-1) > 1e-9 {
		t.Errorf("peak %.9f V, want %.9f V", got, low)
	}
	if got < 110 {
		t.Errorf("peak %.1f V: this capacitance should have carried it well above twice the bus voltage", got)
	}
}

// TestSmallESR: as the ESR of a lone capacitor vanishes, the waveform goes over into that of a capacitor
// straight across the node, in proportion to the ESR.
func TestSmallESR(t *testing.T) {
	cfg := Default()
	cfg.Parts.CTol = 0
	peak := func(esr float64) float64 {
		p := cfg.Parts
		p.ESR = esr
		c := newCircuit(cfg.Board, p, Network{Kind: C, C: 470e-12}, 48, 4, 0)
		return solved(t, c, 60e-9, 1e-9).peak.Peak
	}
	none, small, larger := peak(0), peak(0.005), peak(0.01)
	if ratio := (none - larger) / (none - small); math.Abs(ratio-2) > 0.01 {
		t.Errorf("peaks %.6f, %.6f, %.6f V without, with 5 and with 10 milliohm: ratio of the falls %.4f, want 2", none, small, larger, ratio)
	}
}

// TestStiffNetworks: whatever network passes the check is integrated, however small or large its parts.
func TestStiffNetworks(t *testing.T) {
	m := newModel(t, Default())
	bare, err := m.Respond(t.Context(), Network{Kind: Bare})
	if err != nil {
		t.Fatal(err)
	}
	for _, n := range []Network{
		{C, 1e-18, 0}, {C, 4.7e-12, 0}, {C, 22e-12, 0}, {C, 1e-6, 0}, {RC, 1e-18, 1e-9}, {RC, 1e-18, 1e9}, {RC, 1e-6, 1e-9},
		{RC, 1e-6, 1e9}, {RC, 15e-12, 0.01}, {RCD, 1e-6, 0.01}, {RCD, 1e-12, 100}, {RCD, 1e-6, 1e6},
	} {
		r, err := m.Respond(t.Context(), n)
		if err != nil {
			t.Errorf("%+v: %v", n, err)
		} else if !(r.Peak > 47.9 && r.Peak < bare.Peak+0.01) {
			t.Errorf("%+v: %+v", n, r)
		}
		if n.C == 1e-18 && math.Abs(r.Peak-bare.Peak) > 0.01 {
			t.Errorf("%+v: peak %g V, bare %g V", n, r.Peak, bare.Peak)
		}
	}
}

// TestCharge: the charge is the integral of the capacitance, and the capacitance is smooth at 0 V.
func TestCharge(t *testing.T) {
	for _, b := range []Board{
		{FixedC: 1e-10, JunctionC: 3e-10, JunctionV: 4, Grading: 0.5},
		{JunctionC: 3e-10, JunctionV: 0.7, Grading: 0.33},
		{FixedC: 1e-10},
	} {
		const v, h = 37., 1e-3
		if got, want := (b.ChargeAt(v+h)-b.ChargeAt(v-h))/(2*h), b.CapacitanceAt(v); math.Abs(got/want-1) > 1e-8 {
			t.Errorf("%+v: dQ/dv %g, C %g", b, got, want)
		}
		left := (b.CapacitanceAt(0) - b.CapacitanceAt(-1e-6)) / 1e-6
		right := (b.CapacitanceAt(1e-6) - b.CapacitanceAt(0)) / 1e-6
		if math.Abs(left-right) > 1e-5*math.Abs(left) {
			t.Errorf("%+v: dC/dv %g below 0 V and %g above", b, left, right)
		}
	}
}
