package snubber_test

import (
	"encoding/csv"
	"math"
	"math/cmplx"
	"os"
	"strconv"
	"testing"

	"ringbook/snubber"

	"pgregory.net/rapid"
)

// table reads a CSV of testdata as rows of named numbers; a cell that is no number is NaN.
func table(t testing.TB, name string) []map[string]float64 {
	t.Helper()
	f, err := os.Open("testdata/" + name)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var out []map[string]float64
	for _, row := range rows[1:] {
		m := map[string]float64{}
		for i, cell := range row {
			v, err := strconv.ParseFloat(cell, 64)
			if err != nil {
				v = math.NaN()
			}
			m[rows[0][i]] = v
		}
		out = append(out, m)
	}
	if len(out) == 0 {
		t.Fatalf("%s holds no rows", name)
	}
	return out
}

// near fails the test when got is not want within rel of it.
func near(t testing.TB, what string, got, want, rel float64) {
	t.Helper()
	if !(math.Abs(got-want) <= rel*math.Abs(want)) {
		t.Errorf("%s = %.15g, want %.15g: off by %.2g of it, allowed %.2g", what, got, want, math.Abs(got-want)/math.Abs(want), rel)
	}
}

// A loop with w0 = 1/ns and Z0 = 10 ohm: normalised tables are tried in ordinary units, so that a scale left
// out somewhere shows.
const (
	unitL = 10e-9
	unitC = 100e-12
	unitT = 1e-9
	unitZ = 10.0
	unitE = 48.0
)

func normalised(t testing.TB, a, rho, chi, loss float64) snubber.Response {
	t.Helper()
	n := snubber.Network{Kind: snubber.Bare}
	if a > 0 {
		n = snubber.Network{Kind: snubber.C, C: a * unitC, ESR: rho * unitZ}
	}
	r, err := snubber.Respond(
		snubber.Loop{Inductance: unitL, Capacitance: unitC, Resistance: loss * unitZ},
		n, snubber.Excitation{Bus: unitE, Current: chi * unitE / unitZ})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// The third-order reference table (testdata/README.md).
func TestThirdOrderTable(t *testing.T) {
	for _, row := range table(t, "third_order.csv") {
		r := normalised(t, row["Cs_over_Cp"], row["Rs_over_Z0"], row["I0Z0_over_E"], row["r_over_Z0"])
		p := r.Peak()
		near(t, "peak", p.Volts/unitE, row["vpk_over_E"], 1e-9)
		near(t, "time of peak", p.At/unitT, row["t_pk_w0"], 1e-8)
		// At the triple pole itself the damping ratio is known to the root of the rounding error only.
		if row["zeta_pair"] < 0.999 {
			near(t, "damping ratio", r.DampingRatio(), row["zeta_pair"], 1e-9)
			hz, _ := r.RingHz()
			near(t, "ring", hz*2*math.Pi*unitT, row["wd_over_w0"], 1e-9)
			near(t, "real pole", real(r.Poles()[2])*unitT, row["real_pole_over_w0"], 1e-9)
		}
	}
}

// The standard second-order overshoot (testdata/README.md).
func TestSecondOrderPeak(t *testing.T) {
	for _, row := range table(t, "second_order_peak.csv") {
		p := normalised(t, 0, 0, row["I0Z0_over_E"], row["r_over_Z0"]).Peak()
		near(t, "peak", p.Volts/unitE, row["vpk_over_E"], 1e-10)
		near(t, "time of peak", p.At/unitT, row["t_pk_w0"], 1e-9)
	}
}

// With Cs = 8 C and Rs = 3 sqrt(3)/8 Z0 all three poles meet at -1/sqrt(3), and the step's peak is 1 + 5/e^3 at
// 3 sqrt(3): derived from the characteristic polynomial. Tried at the point and around it, where poles nearly meet.
func TestTriplePole(t *testing.T) {
	rho := 3 * math.Sqrt(3) / 8
	want := 1 + 5*math.Exp(-3)
	p := normalised(t, 8, rho, 0, 0).Peak()
	near(t, "peak", p.Volts/unitE, want, 1e-12)
	near(t, "time of peak", p.At/unitT, 3*math.Sqrt(3), 1e-7)
	for _, d := range []float64{1e-15, 1e-13, 1e-11, 1e-9, 1e-7, 1e-5} {
		for _, sign := range []float64{-1, 1} {
			p := normalised(t, 8*(1+sign*d), rho*(1-sign*d), 0, 0).Peak()
			near(t, "peak beside the triple pole", p.Volts/unitE, want, 2*d+1e-12)
		}
	}
}

// Largest damping for a <= 8 is (sqrt(1+a)-1)/2 at rho = (1+a)^(3/4)/a, derived; and the least peak over rho
// (third_order_minpeak_I0.csv, two minimisers).
func TestOptima(t *testing.T) {
	for _, a := range []float64{1, 2, 3, 4, 6} {
		rho := math.Pow(1+a, 0.75) / a
		best := normalised(t, a, rho, 0, 0).DampingRatio()
		near(t, "largest damping", best, (math.Sqrt(1+a)-1)/2, 1e-10)
		for _, off := range []float64{0.99, 1.01} {
			if other := normalised(t, a, rho*off, 0, 0).DampingRatio(); other >= best {
				t.Errorf("a = %g: damping %g at %g of the best resistor is not below %g", a, other, off, best)
			}
		}
	}
	for _, row := range table(t, "third_order_minpeak_I0.csv") {
		p := normalised(t, row["Cs_over_Cp"], row["Rs_over_Z0"], row["I0Z0_over_E"], 0).Peak()
		near(t, "least peak", p.Volts/unitE, row["vpk_over_E"], 1e-8)
	}
}

// a = 2, rho = 1: 2s^3+3s^2+2s+1 = (s+1)(2s^2+s+1), by hand.
func TestFactoredCase(t *testing.T) {
	r := normalised(t, 2, 1, 0, 0)
	near(t, "damping ratio", r.DampingRatio(), math.Sqrt2/4, 1e-14)
	near(t, "natural frequency", cmplx.Abs(r.Poles()[0])*unitT, 1/math.Sqrt2, 1e-14)
	near(t, "real pole", real(r.Poles()[2])*unitT, -1, 1e-14)
}

// A capacitor alone with r = 0 rings at f0/sqrt(1+a) and still doubles the step: derived.
func TestCapacitorAlone(t *testing.T) {
	for _, a := range []float64{0.1, 1, 3, 10} {
		r := normalised(t, a, 0, 0, 0)
		hz, ok := r.RingHz()
		if !ok {
			t.Fatal("an undamped loop does not ring")
		}
		near(t, "ring", hz*2*math.Pi*unitT, 1/math.Sqrt(1+a), 1e-14)
		near(t, "peak", r.Peak().Volts/unitE, 2, 1e-14)
	}
}

// A resistor so small that it is a wire, or so large that the network is not there, gives what the wire or the
// bare node gives.
func TestLimits(t *testing.T) {
	wire := normalised(t, 3, 0, 0.5, 0.05).Peak().Volts
	near(t, "tiny resistor", normalised(t, 3, 1e-9, 0.5, 0.05).Peak().Volts, wire, 1e-8)
	bare := normalised(t, 0, 0, 0.5, 0.05).Peak().Volts
	near(t, "huge resistor", normalised(t, 3, 1e9, 0.5, 0.05).Peak().Volts, bare, 1e-8)
}

func circuit(t *rapid.T) (snubber.Loop, snubber.Network, snubber.Excitation) {
	log := func(name string, lo, hi float64) float64 {
		return math.Exp(rapid.Float64Range(math.Log(lo), math.Log(hi)).Draw(t, name))
	}
	l := snubber.Loop{Inductance: log("L", 1e-9, 1e-5), Capacitance: log("C", 1e-12, 1e-8)}
	z := l.Impedance()
	l.Resistance = z * rapid.SampledFrom([]float64{0, 1e-3, 0.05, 0.3, 1, 2, 3}).Draw(t, "r/Z0")
	n := snubber.Network{Kind: snubber.RC, C: l.Capacitance * log("a", 0.01, 100), R: z * log("rho", 0.01, 100)}
	e := snubber.Excitation{Bus: log("E", 1, 1000)}
	e.Current = e.Bus / z * rapid.SampledFrom([]float64{0, 0.1, 1, 10}).Draw(t, "chi")
	return l, n, e
}

// The response obeys the circuit's equations at every instant, and no instant is higher than the peak.
func TestResponseObeysKirchhoff(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, n, e := circuit(t)
		r, err := snubber.Respond(l, n, e)
		if err != nil {
			t.Fatal(err)
		}
		peak := r.Peak()
		unit := math.Sqrt(l.Inductance * l.Capacitance)
		scale := peak.Volts + e.Current*l.Impedance()
		for k := range 400 {
			at := unit * 0.05 * float64(k)
			if v := r.NodeAt(at); v > peak.Volts+1e-11*scale {
				t.Fatalf("node at %g s is %.15g V, above the peak %.15g V at %g s", at, v, peak.Volts, peak.At)
			}
		}
		// Central differences against the right-hand sides.
		at := unit * rapid.Float64Range(0.1, 20).Draw(t, "tau")
		h := 1e-5 * unit
		if tau := n.R * math.Min(n.C, l.Capacitance); tau < unit {
			h = 1e-5 * tau
		}
		v, u, i := r.NodeAt(at), r.CapacitorAt(at), r.LoopCurrentAt(at)
		check := func(what string, got, want, scale float64) {
			if math.Abs(got-want) > 1e-6*scale {
				t.Fatalf("%s: %g, want %g (scale %g)", what, got, want, scale)
			}
		}
		amps := scale / l.Impedance()
		check("C dv/dt", l.Capacitance*(r.NodeAt(at+h)-r.NodeAt(at-h))/(2*h), i-(v-u)/n.R, amps*unit/h*1e-4+amps+scale/n.R)
		check("L di/dt", l.Inductance*(r.LoopCurrentAt(at+h)-r.LoopCurrentAt(at-h))/(2*h), e.Bus-v-l.Resistance*i, scale*unit/h*1e-4+scale)
		check("Cs du/dt", n.C*(r.CapacitorAt(at+h)-r.CapacitorAt(at-h))/(2*h), (v-u)/n.R, amps*unit/h*1e-4+scale/n.R)
	})
}

func TestRespondRefuses(t *testing.T) {
	good := snubber.Loop{Inductance: 1e-8, Capacitance: 1e-10}
	e := snubber.Excitation{Bus: 48, Current: 1}
	for _, c := range []struct {
		what string
		l    snubber.Loop
		n    snubber.Network
		e    snubber.Excitation
	}{
		{"no inductance", snubber.Loop{Capacitance: 1e-10}, snubber.Network{Kind: snubber.Bare}, e},
		{"negative loss", snubber.Loop{Inductance: 1e-8, Capacitance: 1e-10, Resistance: -1}, snubber.Network{Kind: snubber.Bare}, e},
		{"NaN capacitance", snubber.Loop{Inductance: 1e-8, Capacitance: math.NaN()}, snubber.Network{Kind: snubber.Bare}, e},
		{"bare with a capacitor", good, snubber.Network{Kind: snubber.Bare, C: 1e-10}, e},
		{"rc without a resistor", good, snubber.Network{Kind: snubber.RC, C: 1e-10}, e},
		{"unknown kind", good, snubber.Network{Kind: "lc", C: 1e-10}, e},
		{"rcd", good, snubber.Network{Kind: snubber.RCD, C: 1e-10, R: 1}, e},
		{"negative bus", good, snubber.Network{Kind: snubber.Bare}, snubber.Excitation{Bus: -1}},
		{"infinite current", good, snubber.Network{Kind: snubber.Bare}, snubber.Excitation{Bus: 1, Current: math.Inf(1)}},
	} {
		if _, err := snubber.Respond(c.l, c.n, c.e); err == nil {
			t.Errorf("%s: accepted", c.what)
		}
	}
}

func BenchmarkPeakRC(b *testing.B) {
	l := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.4}
	n := snubber.Network{Kind: snubber.RC, C: 560e-12, R: 8.2}
	e := snubber.Excitation{Bus: 48, Current: 4}
	for b.Loop() {
		r, _ := snubber.Respond(l, n, e)
		if r.Peak().Volts < 48 {
			b.Fatal("no peak")
		}
	}
}
