package snubber_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"reflect"
	"strings"
	"testing"

	"ringbook/snubber"
	"ringbook/snubber/preferred"
)

func ahead(t testing.TB, f *snubber.FitResult, at snubber.OperatingPoint, n int) *snubber.Prospect {
	t.Helper()
	p, _, err := f.Ahead(at, n, 1)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

var demoPoint = snubber.OperatingPoint{BusV: 48, CurrentA: 4, SwitchingHz: 300e3}

func recommendation(t testing.TB, p *snubber.Prospect, lim snubber.Limits) *snubber.Recommendation {
	t.Helper()
	r, err := snubber.Recommend(context.Background(), p, lim)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// With the loop known exactly and parts without tolerance, the choice is the smallest capacitor of the series with which
// any resistor of the series keeps the limit: found here by trying every pair.
func TestChoiceIsTheSmallest(t *testing.T) {
	loop, e := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}, snubber.Excitation{Bus: 48, Current: 4}
	p, err := snubber.Exactly(loop, e)
	if err != nil {
		t.Fatal(err)
	}
	for _, limit := range []float64{90, 80, 70, 64} {
		got := recommendation(t, p, snubber.Limits{MaxPeak: limit, SwitchingHz: 300e3})
		cs, _ := preferred.E12.Between(18e-12, 18e-9)
		rs, _ := preferred.E24.Between(0.3, 240)
		want := math.Inf(1)
		for _, c := range cs {
			for _, r := range rs {
				x, err := snubber.Respond(loop, snubber.Network{Kind: snubber.RC, C: c, R: r}, e)
				if err != nil {
					t.Fatal(err)
				}
				if x.Peak().Volts <= limit {
					want = math.Min(want, c)
				}
			}
		}
		if !got.Met || got.Choice.C != want {
			t.Errorf("limit %g V: chose %g F, the smallest is %g F", limit, got.Choice.C, want)
		}
		if got.Choice.Peak.Value > limit || got.Choice.WorstV > limit {
			t.Errorf("limit %g V: peak %+v, worst %g V", limit, *got.Choice.Peak, got.Choice.WorstV)
		}
		last := got.Choice
		for i, a := range got.Alternatives {
			if a.LossW <= last.LossW || a.WorstV >= last.WorstV {
				t.Errorf("limit %g V: alternative %d loses %g W for %g V after %g W for %g V", limit, i, a.LossW, a.WorstV, last.LossW, last.WorstV)
			}
			last = &got.Alternatives[i]
		}
	}
}

// The same seed gives the same answer, and more uncertainty never a smaller capacitor.
func TestChoiceIsRobust(t *testing.T) {
	f := fit(t, series(7, 6, 0, 2))
	lim := snubber.Limits{MaxPeak: 76, SwitchingHz: 300e3}
	plain := recommendation(t, ahead(t, f, demoPoint, 2000), lim)
	if again := recommendation(t, ahead(t, f, demoPoint, 2000), lim); !reflect.DeepEqual(plain, again) {
		t.Error("the same seed gave another answer")
	}
	lim.CTol, lim.RTol = 0.2, 0.05
	loose := recommendation(t, ahead(t, f, demoPoint, 2000), lim)
	if loose.Choice.C <= plain.Choice.C {
		t.Errorf("with parts of 20 %% the choice is %g F, with exact ones %g F", loose.Choice.C, plain.Choice.C)
	}
	// The worst corner on the true loop keeps the limit.
	for _, dc := range []float64{0.8, 1.2} {
		for _, dr := range []float64{0.95, 1.05} {
			x, err := snubber.Respond(snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6},
				snubber.Network{Kind: snubber.RC, C: loose.Choice.C * dc, R: loose.Choice.R * dr}, snubber.Excitation{Bus: 48, Current: 4})
			if err != nil {
				t.Fatal(err)
			}
			if v := x.Peak().Volts; v > 76 {
				t.Errorf("at a corner the peak is %g V", v)
			}
		}
	}
}

// Each limit is kept, or the nearest miss says which is not and what would cure it.
func TestLimitsAreKept(t *testing.T) {
	p, err := snubber.Exactly(snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}, snubber.Excitation{Bus: 48, Current: 4})
	if err != nil {
		t.Fatal(err)
	}
	base := snubber.Limits{MaxPeak: 80, SwitchingHz: 300e3}
	damped := base
	damped.MinDamping = 0.5
	if r := recommendation(t, p, damped); !r.Met || r.Choice.Damping.Value < 0.5 {
		t.Errorf("damping %+v", *r.Choice.Damping)
	}
	quick := base
	quick.SettleS, quick.SettleBand = 25e-9, 0.05
	r := recommendation(t, p, quick)
	x, _ := snubber.Respond(p.Loop, snubber.Network{Kind: snubber.RC, C: r.Choice.C, R: r.Choice.R}, p.Excitation)
	for at := 25e-9; at < 200e-9; at += 0.1e-9 {
		if r.Met && math.Abs(x.NodeAt(at)-48) > 0.05*48 {
			t.Fatalf("at %g s the node is at %g V", at, x.NodeAt(at))
		}
	}
	if !r.Met {
		t.Errorf("nothing settles: %v", r.Warnings)
	}
	cheap := base
	cheap.MaxPeak, cheap.MaxLoss = 62, 0.3
	if r := recommendation(t, p, cheap); r.Met || !strings.Contains(strings.Join(r.Warnings, " "), "loses") && !strings.Contains(strings.Join(r.Warnings, " "), "peaks") {
		t.Errorf("met %v: %v", r.Met, r.Warnings)
	}
	below := base
	below.MaxPeak = 40
	if r := recommendation(t, p, below); r.Met || !strings.Contains(r.Warnings[0], "not above the bus") || r.Choice.WorstV < 48 || r.Choice.WorstV > 50 {
		t.Errorf("a limit below the bus: met %v, nearest %+v: %v", r.Met, *r.Choice, r.Warnings)
	}
	hand := base
	hand.OnHandC, hand.OnHandR = []float64{330e-12, 1e-9}, []float64{4.7, 10, 47}
	if r := recommendation(t, p, hand); !r.Met || (r.Choice.C != 330e-12 && r.Choice.C != 1e-9) || (r.Choice.R != 4.7 && r.Choice.R != 10 && r.Choice.R != 47) {
		t.Errorf("chose %g ohm, %g F", r.Choice.R, r.Choice.C)
	}
	hand.OnHandC = []float64{10e-12}
	if r := recommendation(t, p, hand); r.Met || len(r.Warnings) == 0 {
		t.Error("a drawer without a suitable part met the limits")
	}
	alone := base
	alone.Kinds = []snubber.Kind{snubber.C}
	alone.MaxPeak = 97
	if r := recommendation(t, p, alone); !r.Met || r.Choice.Network != snubber.C || r.Choice.R != 0 {
		t.Errorf("a capacitor alone: %+v", *r.Choice)
	}
}

// Where the rule of thumb stops the ring and leaves the first spike, a sentence says so.
func TestFirstSpike(t *testing.T) {
	p, err := snubber.Exactly(snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}, snubber.Excitation{Bus: 48, Current: 15})
	if err != nil {
		t.Fatal(err)
	}
	r := recommendation(t, p, snubber.Limits{MaxPeak: 80, SwitchingHz: 300e3})
	if !strings.Contains(strings.Join(r.Warnings, "\n"), "first spike") {
		t.Errorf("rule of thumb %+v: %v", *r.RuleOfThumb, r.Warnings)
	}
}

func TestRecommendRefuses(t *testing.T) {
	p, err := snubber.Exactly(snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12}, snubber.Excitation{Bus: 48, Current: 4})
	if err != nil {
		t.Fatal(err)
	}
	for what, c := range map[string]struct {
		lim  snubber.Limits
		want string
	}{
		"no limit":        {snubber.Limits{SwitchingHz: 1e5}, "peak limit"},
		"no frequency":    {snubber.Limits{MaxPeak: 80}, "switching frequency"},
		"damping of two":  {snubber.Limits{MaxPeak: 80, SwitchingHz: 1e5, MinDamping: 2}, "damping"},
		"tolerance of 1":  {snubber.Limits{MaxPeak: 80, SwitchingHz: 1e5, CTol: 1}, "tolerances"},
		"negative part":   {snubber.Limits{MaxPeak: 80, SwitchingHz: 1e5, OnHandC: []float64{-1}}, "on hand"},
		"unknown network": {snubber.Limits{MaxPeak: 80, SwitchingHz: 1e5, Kinds: []snubber.Kind{"lc"}}, "network"},
		"empty drawer":    {snubber.Limits{MaxPeak: 80, SwitchingHz: 1e5, OnHandC: []float64{}}, "on hand"},
	} {
		if r, err := snubber.Recommend(context.Background(), p, c.lim); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, %v", what, r, err)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := snubber.Recommend(ctx, p, snubber.Limits{MaxPeak: 80, SwitchingHz: 1e5}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	// A fit without a peak and a point without a load current: it says what to measure.
	trials := series(7, 6, 0, 9)
	for i := range trials {
		trials[i].Readings = trials[i].Readings[:2]
		trials[i].Point.CurrentA = 0
	}
	f := fit(t, trials)
	if _, _, err := f.Ahead(f.Hardest(trials), 10, 1); err == nil || !strings.Contains(err.Error(), "read peak_v") {
		t.Errorf("no excitation: %v", err)
	}
}

// Voltages of 10 kV and rings of 1 GHz are finite answers like any other.
func TestExtremes(t *testing.T) {
	for _, c := range []struct {
		l snubber.Loop
		e snubber.Excitation
	}{
		{snubber.Loop{Inductance: 1e-6, Capacitance: 1e-9, Resistance: 1}, snubber.Excitation{Bus: 10e3, Current: 100}},
		{snubber.Loop{Inductance: 1e-9, Capacitance: 25e-12, Resistance: 0.1}, snubber.Excitation{Bus: 5, Current: 0.5}},
	} {
		p, err := snubber.Exactly(c.l, c.e)
		if err != nil {
			t.Fatal(err)
		}
		r := recommendation(t, p, snubber.Limits{MaxPeak: 1.5 * c.e.Bus, SwitchingHz: 1e5, CTol: 0.05, RTol: 0.01})
		if !r.Met || !(r.Choice.WorstV <= 1.5*c.e.Bus) || !(r.Choice.LossW > 0) {
			t.Errorf("%+v: %+v", c, *r.Choice)
		}
	}
}

// A whole recommendation with its draws; the parts of both series over three decades and two, then a quarter of them.
func BenchmarkRecommend(b *testing.B) {
	f := fit(b, series(7, 6, 0, 2))
	for _, c := range []struct {
		draws  int
		cs, rs preferred.Series
	}{{2000, preferred.E12, preferred.E24}, {8000, preferred.E12, preferred.E24}, {2000, preferred.E48, preferred.E96}} {
		b.Run(fmt.Sprintf("%d-draws-%vx%v", c.draws, c.cs, c.rs), func(b *testing.B) {
			for b.Loop() {
				recommendation(b, ahead(b, f, demoPoint, c.draws), snubber.Limits{MaxPeak: 76, SwitchingHz: 300e3, CTol: 0.05, RTol: 0.01, CSeries: c.cs, RSeries: c.rs})
			}
		})
	}
}

// The worst peak is that of the worst corner, whichever it is, and what the fit leaves open is on top of it.
func TestWorstPeak(t *testing.T) {
	loop, e := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}, snubber.Excitation{Bus: 48, Current: 4}
	p, err := snubber.Exactly(loop, e)
	if err != nil {
		t.Fatal(err)
	}
	r := recommendation(t, p, snubber.Limits{MaxPeak: 76, SwitchingHz: 300e3, CTol: 0.1, RTol: 0.05})
	want := 0.0
	for _, dc := range []float64{0.9, 1.1} {
		for _, dr := range []float64{0.95, 1.05} {
			x, err := snubber.Respond(loop, snubber.Network{Kind: snubber.RC, C: r.Choice.C * dc, R: r.Choice.R * dr}, e)
			if err != nil {
				t.Fatal(err)
			}
			want = math.Max(want, x.Peak().Volts)
		}
	}
	near(t, "worst peak", r.Choice.WorstV, want, 1e-12)

	c := recommendation(t, ahead(t, fit(t, series(7, 6, 0, 2)), demoPoint, 2000), snubber.Limits{MaxPeak: 76, SwitchingHz: 300e3}).Choice
	if c.Peak.U < 0.05 || c.WorstV < c.Peak.Value+1.8*c.Peak.U || c.WorstV > c.Peak.Value+3*c.Peak.U {
		t.Errorf("peak %+v, worst %g V: the 99th percentile of draws lies some 2.3 standard uncertainties up", *c.Peak, c.WorstV)
	}
}

// The peak of a network with a diode is TurnOff's, and its worst that of the worst corner.
func TestDiodePeakIsExact(t *testing.T) {
	loop, e := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}, snubber.Excitation{Bus: 24, Current: 2}
	p, err := snubber.Exactly(loop, e)
	if err != nil {
		t.Fatal(err)
	}
	c := recommendation(t, p, snubber.Limits{MaxPeak: 36, SwitchingHz: 300e3, CTol: 0.1, RTol: 0.05, Kinds: []snubber.Kind{snubber.RCD}}).Choice
	peak := func(dc, dr float64) float64 {
		n := snubber.Network{Kind: snubber.RCD, C: c.C * dc, R: c.R * dr, DiodeDrop: 0.8, DiodeOhm: 0.1}
		turn, err := snubber.TurnOff(loop, n, e)
		if err != nil {
			t.Fatal(err)
		}
		return turn.Peak.Volts
	}
	near(t, "peak", c.Peak.Value, peak(1, 1), 1e-9)
	want := 0.0
	for _, dc := range []float64{0.9, 1.1} {
		for _, dr := range []float64{0.95, 1.05} {
			want = math.Max(want, peak(dc, dr))
		}
	}
	near(t, "worst peak", c.WorstV, want, 2e-3)
	if c.WorstV < want*(1-1e-9) {
		t.Errorf("worst %g V, a corner reaches %g V", c.WorstV, want)
	}
}
