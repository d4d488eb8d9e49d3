package snubber_test

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"ringbook/snubber"
	"ringbook/snubber/scipytest"

	"pgregory.net/rapid"
)

// A whole cycle that repeats itself, its on and off times long or short against the network, integrated by SciPy: every
// energy, and that they add up to what the source and the loop's current gave.
func TestCycleAgainstSolveIVP(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 17))
	log := func(lo, hi float64) float64 { return lo * math.Pow(hi/lo, rng.Float64()) }
	var rows [][10]float64
	for i, row := range randomCircuits(80) {
		w0, z := 1/math.Sqrt(row[0]*row[1]), math.Sqrt(row[0]/row[1])
		var x [10]float64
		if row[3] > 0 { // nothing stiff, which SciPy's explicit method takes too long for
			row[3], row[4] = z*log(0.4, 4), row[1]*log(0.3, 8)
		}
		copy(x[:7], row[:])
		slow := math.Max(row[3]*row[4]*w0, 1)
		x[7] = log(0.1, 1) * z
		x[8], x[9] = log(0.05, 3)*slow/w0, log(0.2, 6)*slow/w0
		if i%5 == 0 {
			x[6] = 0
		}
		rows = append(rows, x)
	}
	var want []struct{ OffRs, OffLoop, OnRs, OnSwitch, Source, Current, Miss float64 }
	scipytest.Run(t, "testdata/cycle.py", rows, &want)
	worst, short := 0.0, 0
	for i, x := range rows {
		l, n, e := parts([7]float64(x[:7]))
		got, err := snubber.EnergyOf(l, n, e, snubber.Cycle{OnS: x[8], OffS: x[9], SwitchOhm: x[7]})
		if err != nil {
			t.Fatal(err)
		}
		w := want[i]
		if w.Miss > 1e-9 {
			t.Fatalf("circuit %v: SciPy's cycle misses its start by %g", x, w.Miss)
		}
		whole := math.Abs(w.OffRs) + math.Abs(w.OffLoop) + w.OnRs + w.OnSwitch
		if got.Added < 0.9*n.C*e.Bus*e.Bus {
			short++
		}
		for _, c := range []struct {
			what      string
			got, want float64
		}{
			{"resistor at turn-off", got.Off.Resistor, w.OffRs},
			{"loop at turn-off", got.Off.Loop, w.OffLoop},
			{"resistor at turn-on", got.On.Resistor, w.OnRs},
			{"switch at turn-on", got.On.Switch, w.OnSwitch},
			{"all", got.Off.Total() + got.On.Total(), w.Source + w.Current},
			{"added and anyway", got.Added + got.Anyway, w.Source + w.Current},
		} {
			off := math.Abs(c.got-c.want) / whole
			worst = math.Max(worst, off)
			if !(off <= 1e-8) {
				t.Errorf("circuit %d %v: %s %g J, SciPy %g J, of %g J", i, x, c.what, c.got, c.want, whole)
			}
		}
	}
	if short < 20 {
		t.Errorf("only %d cycles were too short for their network", short)
	}
	t.Logf("largest difference over %d cycles, %d of them short: %.1g of the cycle's energy", len(rows), short, worst)
}

// The energies of the two edges are what the source gives to the network and to the loop, whatever the times.
func TestEnergiesAddUp(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l, n, e := circuit(t)
		n.ESR = n.R * rapid.SampledFrom([]float64{0, 0.01, 1}).Draw(t, "ESR/R")
		unit := math.Sqrt(l.Inductance*l.Capacitance) + n.SeriesOhm()*n.C
		times := rapid.SampledFrom([]float64{0, 0.01, 0.3, 3, 100})
		c := snubber.Cycle{OnS: unit * times.Draw(t, "on"), OffS: unit * times.Draw(t, "off"),
			SwitchOhm: n.R * rapid.SampledFrom([]float64{0, 1e-6, 1e-3, 0.1, 10}).Draw(t, "Ron/R")}
		w, err := snubber.EnergyOf(l, n, e, c)
		if err != nil {
			t.Fatal(err)
		}
		scale := (l.Capacitance+n.C)*e.Bus*e.Bus + l.Inductance*e.Current*e.Current
		if off := math.Abs(w.Off.Total() + w.On.Total() - w.Added - w.Anyway); !(off <= 1e-9*scale) {
			t.Fatalf("%+v: edges take %g J, the source and the current give %g J", c, w.Off.Total()+w.On.Total(), w.Added+w.Anyway)
		}
		for what, x := range map[string]float64{"resistor off": w.Off.Resistor, "ESR off": w.Off.ESR, "loop": w.Off.Loop, "resistor on": w.On.Resistor, "ESR on": w.On.ESR, "switch": w.On.Switch} {
			if !(x >= -1e-9*scale) {
				t.Fatalf("%+v: %s takes %g J of %g J", c, what, x, scale)
			}
		}
		if n.ESR > 0 && math.Abs(w.Off.ESR*n.R-w.Off.Resistor*n.ESR) > 1e-9*scale*n.R {
			t.Fatalf("ESR takes %g J beside the resistor's %g J", w.Off.ESR, w.Off.Resistor)
		}
	})
}

// Charging and discharging each cost C V^2/2, whatever the resistance: textbook. The rest is the loop's.
func TestAddedIsCVSquared(t *testing.T) {
	l := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.3}
	e := snubber.Excitation{Bus: 48, Current: 4}
	for _, n := range []snubber.Network{
		{Kind: snubber.RC, C: 560e-12, R: 8.2}, {Kind: snubber.RC, C: 560e-12, R: 82, ESR: 3}, {Kind: snubber.C, C: 560e-12},
		{Kind: snubber.C, C: 560e-12, ESR: 1},
	} {
		p, err := snubber.LossOf(l, n, e, snubber.Cycle{Hz: 300e3, SwitchOhm: 0.05})
		if err != nil {
			t.Fatal(err)
		}
		near(t, "added", p.Added, 300e3*n.C*48*48, 1e-12)
		near(t, "anyway", p.Anyway, 300e3*(l.Capacitance*48*48+l.Inductance*4*4/2), 1e-12)
		near(t, "total", p.Total, p.Added+p.Anyway, 1e-12)
		if got := p.Resistor > 0; got != n.Kind.HasR() {
			t.Errorf("network %s: its resistor takes %g W", n.Kind, p.Resistor)
		}
	}
}

// An RC switched between E and 0 is charged to E(1-a)/(1-ab) and discharged to b times that, with a = exp(-toff/RC)
// and b = exp(-ton/RC): derived. The loop is far faster than the network, its capacitance
// and resistance far smaller.
func TestShortTimes(t *testing.T) {
	l := snubber.Loop{Inductance: 1e-9, Capacitance: 1e-14, Resistance: 200}
	n := snubber.Network{Kind: snubber.RC, R: 1e6, C: 10e-12}
	e := snubber.Excitation{Bus: 100}
	rc := n.R * n.C
	for _, times := range [][2]float64{{0.2, 0.5}, {1, 1}, {3, 0.1}, {0.1, 3}} {
		a, b := math.Exp(-times[1]), math.Exp(-times[0])
		p, err := snubber.EnergyOf(l, n, e, snubber.Cycle{OnS: times[0] * rc, OffS: times[1] * rc})
		if err != nil {
			t.Fatal(err)
		}
		high := 100 * (1 - a) / (1 - a*b)
		low := b * high
		near(t, "added", p.Added, 100*n.C*(high-low), 2e-3)
		near(t, "resistor at turn-on", p.On.Resistor, n.C*(high*high-low*low)/2, 2e-3)
		near(t, "resistor at turn-off", p.Off.Resistor, 100*n.C*(high-low)-n.C*(high*high-low*low)/2, 5e-3)
	}
}

// Times so long that all settles, and a switch of next to no resistance, give what leaving them out gives.
func TestLongTimes(t *testing.T) {
	l := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.3}
	e := snubber.Excitation{Bus: 48, Current: 4}
	for _, n := range []snubber.Network{{Kind: snubber.Bare}, {Kind: snubber.C, C: 560e-12}, {Kind: snubber.RC, C: 560e-12, R: 8.2, ESR: 0.1}} {
		want, err := snubber.LossOf(l, n, e, snubber.Cycle{Hz: 100e3})
		if err != nil {
			t.Fatal(err)
		}
		got, err := snubber.LossOf(l, n, e, snubber.Cycle{Hz: 100e3, OnS: 5e-6, OffS: 5e-6, SwitchOhm: 1e-9})
		if err != nil {
			t.Fatal(err)
		}
		for _, c := range []struct {
			what      string
			got, want float64
		}{{"total", got.Total, want.Total}, {"resistor", got.Resistor, want.Resistor}, {"ESR", got.ESR, want.ESR}, {"switch", got.Switch, want.Switch}, {"loop", got.Loop, want.Loop}} {
			near(t, string(n.Kind)+": "+c.what, c.got, c.want, 1e-8)
		}
	}
}

// A resistor and a capacitor charged by a ramp lose (1/x)(1 - (1 - e^-x)/x) of C V^2, x = T/RC (testdata/README.md).
// The ramp is a node of a thousand times their capacitance, charged by the current of a loop too slow to ring.
func TestRampCharging(t *testing.T) {
	for _, row := range table(t, "rc_ramp_loss.csv") {
		x := row["T_over_RC"]
		if x == 0 || x > 50 {
			continue // a step, and a resistor too small beside this node
		}
		const ramp = 1e-6
		n := snubber.Network{Kind: snubber.RC, C: 1e-12, R: ramp / x / 1e-12}
		l := snubber.Loop{Capacitance: 1e-8, Inductance: math.Pow(3e3*ramp, 2) / 1e-8}
		w, err := snubber.EnergyOf(l, n, snubber.Excitation{Current: 1}, snubber.Cycle{OffS: ramp})
		if err != nil {
			t.Fatal(err)
		}
		v := ramp / l.Capacitance
		u := math.Sqrt(2 * w.On.Resistor / n.C) // what the capacitor holds, all of it lost in R at turn-on
		held := n.C * (v - u) * (v - u) / 2     // what R would still take if the node were held
		near(t, "ramp-charged RC", (w.Off.Resistor+held)/(n.C*v*v), row["ER_over_CV2"], 1e-3)
	}
}

// The turn-off snubber's table (testdata/README.md), and its definition integrated: current times voltage.
func TestTurnOffSaving(t *testing.T) {
	e, tf := snubber.Excitation{Bus: 400, Current: 10}, 50e-9
	full := e.Current * tf / (2 * e.Bus)
	for _, row := range table(t, "rcd_turnoff.csv") {
		k := row["Cs_over_Cs1"]
		s, err := snubber.TurnOffSaving(k*full, e, tf)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "without", s.Without, e.Bus*e.Current*tf/2, 1e-14)
		near(t, "with", s.With/s.Without, row["WT"], 1e-6)
		near(t, "stored", s.Stored/s.Without, row["WR"], 1e-6)
		near(t, "total", s.Total/s.Without, row["Wtotal"], 1e-6)
		if k == 0 {
			continue
		}
		sum, steps := 0.0, 200000
		for i := range steps {
			x := (float64(i) + 0.5) / float64(steps)
			v := math.Min(e.Bus, e.Current*tf*x*x/(2*k*full))
			sum += e.Current * (1 - x) * v * tf / float64(steps)
		}
		near(t, "integral of i v", s.With, sum, 1e-8)
		near(t, "best capacitor", s.LeastC, 4./9*full, 1e-14)
	}
	least, _ := snubber.TurnOffSaving(4./9*full, e, tf)
	near(t, "least total", least.Total/least.Without, 5./9, 1e-14)

	l := snubber.Loop{Inductance: 20e-9, Capacitance: 200e-12}
	p, err := snubber.LossOf(l, snubber.Network{Kind: snubber.C, C: 1e-9}, e, snubber.Cycle{Hz: 1e5, FallS: tf})
	if err != nil {
		t.Fatal(err)
	}
	bare, _ := snubber.TurnOffSaving(l.Capacitance, e, tf)
	fitted, _ := snubber.TurnOffSaving(l.Capacitance+1e-9, e, tf)
	near(t, "saved beside the node's own capacitance", p.Saved, 1e5*(bare.With-fitted.With), 1e-12)
}

func TestLossRefuses(t *testing.T) {
	l, n := snubber.Loop{Inductance: 1e-8, Capacitance: 1e-10}, snubber.Network{Kind: snubber.RC, C: 1e-9, R: 10}
	e := snubber.Excitation{Bus: 48, Current: 1}
	for word, c := range map[string]snubber.Cycle{
		"frequency":  {Hz: -1},
		"1e+999":     {Hz: math.Inf(1)},
		"on time":    {OnS: math.NaN()},
		"off time":   {OffS: -1},
		"exceed":     {Hz: 1e6, OnS: 0.6e-6, OffS: 0.5e-6},
		"fall time":  {FallS: math.Inf(1)},
		"resistance": {SwitchOhm: -1},
	} {
		_, err := snubber.LossOf(l, n, e, c)
		if err == nil || word != "1e+999" && !strings.Contains(err.Error(), word) {
			t.Errorf("%+v: %v", c, err)
		}
	}
	for _, s := range []struct {
		c, e, i, tf float64
	}{{-1, 1, 1, 1}, {1, 0, 1, 1}, {1, 1, 0, 1}, {1, 1, 1, 0}, {1, 1, 1, math.NaN()}} {
		if _, err := snubber.TurnOffSaving(s.c, snubber.Excitation{Bus: s.e, Current: s.i}, s.tf); err == nil {
			t.Errorf("turn-off saving of %+v: no error", s)
		}
	}
}

// Nothing switched, no bus, 10 kV and 1 GHz: finite answers.
func TestLossExtremes(t *testing.T) {
	n := snubber.Network{Kind: snubber.RC, C: 1e-9, R: 10}
	l := snubber.Loop{Inductance: 1e-8, Capacitance: 1e-10, Resistance: 0.1}
	for _, x := range []struct {
		l snubber.Loop
		e snubber.Excitation
		c snubber.Cycle
	}{
		{l, snubber.Excitation{Bus: 48, Current: 1}, snubber.Cycle{}},
		{l, snubber.Excitation{}, snubber.Cycle{Hz: 1e5, OnS: 1e-6, OffS: 1e-6}},
		{l, snubber.Excitation{Current: 1}, snubber.Cycle{Hz: 1e5, OnS: 1e-6, OffS: 1e-6, SwitchOhm: 1}},
		{l, snubber.Excitation{Bus: 10e3, Current: 500}, snubber.Cycle{Hz: 1e9, OnS: 0.5e-9, OffS: 0.5e-9, SwitchOhm: 1e-9}},
		{snubber.Loop{Inductance: 1e-15, Capacitance: 1e-15}, snubber.Excitation{Bus: 10e3}, snubber.Cycle{Hz: 1e9, OnS: 1e-12}},
		{snubber.Loop{Inductance: 1, Capacitance: 1e-3, Resistance: 1e6}, snubber.Excitation{Bus: 10e3}, snubber.Cycle{Hz: 1e9, SwitchOhm: 1e6}},
	} {
		p, err := snubber.LossOf(x.l, n, x.e, x.c)
		if err != nil {
			t.Fatal(err)
		}
		for _, w := range []float64{p.Total, p.Resistor, p.ESR, p.Diode, p.Switch, p.Loop, p.Added, p.Anyway, p.Saved} {
			if math.IsNaN(w) || math.IsInf(w, 0) {
				t.Errorf("%+v: %+v", x, p)
			}
		}
		if math.Abs(p.Total-p.Added-p.Anyway) > 1e-6*(math.Abs(p.Added)+math.Abs(p.Anyway)) {
			t.Errorf("%+v: total %g W of %g W added and %g W anyway", x, p.Total, p.Added, p.Anyway)
		}
	}
}

func BenchmarkSwitchingLoss(b *testing.B) {
	l := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.4}
	e := snubber.Excitation{Bus: 48, Current: 4}
	n := snubber.Network{Kind: snubber.RC, C: 560e-12, R: 8.2}
	for name, c := range map[string]snubber.Cycle{"settled": {Hz: 3e5}, "short": {Hz: 3e5, OnS: 1e-8, OffS: 2e-8, SwitchOhm: 0.1}} {
		b.Run(name, func(b *testing.B) {
			for b.Loop() {
				if p, err := snubber.LossOf(l, n, e, c); err != nil || !(p.Total > 0) {
					b.Fatal(err)
				}
			}
		})
	}
}

// With a diode the edges take what the source gives, too; with one that hardly drops, the resistor is spared the
// charging and takes the discharge.
func TestLossWithDiode(t *testing.T) {
	l := snubber.Loop{Inductance: 20e-9, Capacitance: 200e-12, Resistance: 0.4}
	n := snubber.Network{Kind: snubber.RCD, R: 10, C: 1e-9, ESR: 0.05}
	e := snubber.Excitation{Bus: 100, Current: 6}
	p, err := snubber.SwitchingLoss(l, n, e, 2e5)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "added", p.Added, 2e5*n.C*1e4, 1e-12)
	near(t, "total", p.Total, p.Added+p.Anyway, 1e-6)
	w, err := snubber.EnergyOf(l, n, e, snubber.Cycle{OnS: 1e-6, OffS: 1e-6})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "discharge", w.On.Resistor+w.On.ESR, n.C*1e4/2, 1e-12)
	n.Kind = snubber.RC
	rc, err := snubber.EnergyOf(l, n, e, snubber.Cycle{})
	if err != nil {
		t.Fatal(err)
	}
	if w.Off.Resistor > 0.8*rc.Off.Resistor {
		t.Errorf("with a diode the resistor takes %g J at turn-off, without %g J", w.Off.Resistor, rc.Off.Resistor)
	}
	n.Kind = snubber.RCD
	if _, err := snubber.EnergyOf(l, n, e, snubber.Cycle{OffS: 10e-9}); err == nil || !strings.Contains(err.Error(), "longer time") {
		t.Errorf("an off time of one time constant: %v", err)
	}
}

// A network with a diode that has not discharged when the switch opens. With a diode that never conducts it is an rc
// network, whose cycle is known otherwise; with one that does, the energies add up to what the source gave.
func TestDiodeNetworkHalfDischarged(t *testing.T) {
	l, e := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}, snubber.Excitation{Bus: 48, Current: 4}
	for _, on := range []float64{2e-9, 10e-9, 30e-9} {
		c := snubber.Cycle{OnS: on, OffS: 2e-6}
		never := snubber.Network{Kind: snubber.RCD, R: 22, C: 680e-12, DiodeDrop: 1e4, DiodeOhm: 0.1}
		got, err := snubber.EnergyOf(l, never, e, c)
		if err != nil {
			t.Fatal(err)
		}
		want, err := snubber.EnergyOf(l, snubber.Network{Kind: snubber.RC, R: 22, C: 680e-12}, e, c)
		if err != nil {
			t.Fatal(err)
		}
		for what, x := range map[string][2]float64{
			"resistor, off": {got.Off.Resistor, want.Off.Resistor}, "loop": {got.Off.Loop, want.Off.Loop},
			"resistor, on": {got.On.Resistor, want.On.Resistor}, "added": {got.Added, want.Added},
		} {
			near(t, what, x[0], x[1], 1e-6)
		}
		for _, drop := range []float64{0, 0.8} {
			n := snubber.Network{Kind: snubber.RCD, R: 22, C: 680e-12, DiodeDrop: drop, DiodeOhm: 0.1}
			w, err := snubber.EnergyOf(l, n, e, c)
			if err != nil {
				t.Fatal(err)
			}
			near(t, "balance", w.Off.Total()+w.On.Total(), w.Added+w.Anyway, 1e-6)
			if w.Off.Diode <= 0 || w.Added >= n.C*e.Bus*e.Bus {
				t.Errorf("on for %g s: %+v", on, w)
			}
		}
	}
}
