package simbench

import (
	"math"
	"testing"
)

// linear is a loop of L = 1 nH and C = 1 nF, so that Z0 = 1 ohm and w0 = 1e9/s, with a capacitance that no
// voltage changes, a switch that lets go at once and no body diode: the circuit of the closed forms.
func linear(a, rho, chi, r float64) (circuit, float64) {
	const bus = 10
	b := Board{Inductance: 1e-9, FixedC: 1e-9, Resistance: r, PerLoadA: 1}
	n := Network{Kind: RC, C: a * 1e-9, R: rho}
	if a == 0 {
		n = Network{Kind: Bare}
	}
	return newCircuit(b, Parts{DiodeOhm: 1}, n, bus, chi*bus, 0), bus
}

func solved(t testing.TB, c circuit, end, tolerance float64) *record {
	t.Helper()
	r, err := c.solve(t.Context(), end, tolerance)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// TestThirdOrderPeaks compares with peaks and their instants found by DOP853 of SciPy and, apart from
// it, from the eigenvalues with mpmath: dimensionless, a = Cs/Cp, rho = Rs/Z0, chi = I0 Z0/E, r in Z0. The
// row a = 8 is the triple pole, whose peak is 1 + 5/e^3 exactly.
func TestThirdOrderPeaks(t *testing.T) {
	for _, c := range []struct{ a, rho, chi, r, peak, at float64 }{
		{1, 1, 0, 0, 1.70264225057, 3.84678516245},
		{1, 1, 0.5, 0, 1.75497592498, 3.34021185799},
		{2, 1, 0, 0, 1.52765880971, 3.97803516737},
		{3, 0.7, 0, 0, 1.45831530780, 4.58735811971},
		{3, 1, 0, 0, 1.43445492712, 3.98986747446},
		{3, 1, 0, 0.05, 1.36164593267, 3.99117805079},
		{3, 1, 1, 0.05, 1.48854459337, 2.82146714022},
		{3, 1, 0.5, 0.1, 1.32032582717, 3.41391634569},
		{4, 0.8, 1, 0, 1.46948216723, 3.18572447290},
		{4, 0.8, 2, 0.02, 1.75745317403, 2.25949423543},
		{8, 3 * math.Sqrt(3) / 8, 0, 0, 1 + 5/math.Exp(3), 3 * math.Sqrt(3)},
		{8, 3 * math.Sqrt(3) / 8, 1, 0, 1.29444243839, 3.74603376304},
		{10, 0.5, 0, 0, 1.24793017440, 6.48493893048},
		{3, 10, 0, 0, 1.86028684986, 3.15056814303},
		{3, 0.1, 0, 0, 1.84659271671, 6.05499931653},
	} {
		circ, bus := linear(c.a, c.rho, c.chi, c.r)
		got := solved(t, circ, 20e-9, 1e-11).peak
		if math.Abs(got.Peak/bus-c.peak) > 1e-9 || math.Abs(got.PeakAt*1e9-c.at) > 1e-5 {
			t.Errorf("%+v: peak %.12f at %.8f; off by %.1e and %.1e", c, got.Peak/bus, got.PeakAt*1e9, got.Peak/bus-c.peak, got.PeakAt*1e9-c.at)
		}
	}
}

// TestSecondOrder compares the whole waveform of the bare loop with the textbook's underdamped step
// response, derived here: with d = r/2, w = sqrt(1 - d^2) and everything in units of w0, Z0 and E,
//
//	v = 1 - exp(-d t) (cos(w t) + (d - chi)/w sin(w t))
//
// (v(0) = 0, v'(0) = chi), at the samples that a scope would take.
func TestSecondOrder(t *testing.T) {
	for _, c := range []struct{ r, chi float64 }{{0, 0}, {0, 1}, {0.02, 0}, {0.1, 0.5}, {0.1, 1}, {1, 2}} {
		circ, bus := linear(0, 0, c.chi, c.r)
		r := solved(t, circ, 50e-9, 1e-11)
		got := make([]float64, 500)
		const dt = 0.1e-9
		r.sample(0, dt, got)
		d := c.r / 2
		w := math.Sqrt(1 - d*d)
		worst := 0.0
		for i, v := range got {
			tau := float64(i) * dt * 1e9
			want := 1 - math.Exp(-d*tau)*(math.Cos(w*tau)+(d-c.chi)/w*math.Sin(w*tau))
			worst = max(worst, math.Abs(v/bus-want))
		}
		if worst > 2e-9 {
			t.Errorf("r = %g, chi = %g: off by %.1e of the bus voltage", c.r, c.chi, worst)
		}
	}
}

// TestOrders measures how the errors of one step shrink when it is halved: by 2^6 for the step and 2^5
// within it, which is local order 6 and 5 of a method of order 5 with dense output of order 4.
func TestOrders(t *testing.T) {
	circ, _ := linear(3, 1, 0.5, 0.05)
	circ.board.JunctionC, circ.board.JunctionV, circ.board.Grading = 1e-9, 2, 0.4
	y := circ.start()
	exact := func(end float64) state {
		const parts = 64
		z := y
		for i := range parts {
			s, _ := circ.take(end*float64(i)/parts, z, circ.slope(0, z, mode{}), mode{}, end/parts, 1, circ.scale())
			z = s.to
		}
		return z
	}
	errors := func(h float64) (end, middle float64) {
		s, _ := circ.take(0, y, circ.slope(0, y, mode{}), mode{}, h, 1, circ.scale())
		return math.Abs(s.to[1] - exact(h)[1]), math.Abs(s.at(0.3)[1] - exact(0.3 * h)[1])
	}
	end1, mid1 := errors(0.04e-9)
	end2, mid2 := errors(0.02e-9)
	if o := math.Log2(end1 / end2); math.Abs(o-6) > 0.5 {
		t.Errorf("the step has local order %.2f, want 6", o)
	}
	if o := math.Log2(mid1 / mid2); math.Abs(o-5) > 0.5 {
		t.Errorf("the dense output has local order %.2f, want 5", o)
	}
}

// TestFallTime compares a linear loop whose switch current falls in a finite time with its closed form,
// by superposition: the step of E, and the falling current's own answer. With I0 = 1, r = 0, in units of w0
// and Z0, the current i - i_sw into the node rises as 1/tf during the fall, so after it
//
//	v = 1 - cos t + (chi/tf) (cos(t - tf) - cos t)
func TestFallTime(t *testing.T) {
	const chi, tf = 0.8, 0.7
	circ, bus := linear(0, 0, chi, 0)
	circ.board.FallTime = tf * 1e-9
	r := solved(t, circ, 20e-9, 1e-11)
	got := make([]float64, 180)
	r.sample(1e-9, 0.1e-9, got)
	for i, v := range got {
		tau := 1 + 0.1*float64(i)
		want := 1 - math.Cos(tau) + chi/tf*(math.Cos(tau-tf)-math.Cos(tau))
		if math.Abs(v/bus-want) > 2e-9 {
			t.Fatalf("at %g: %.10f, want %.10f", tau, v/bus, want)
		}
	}
}
