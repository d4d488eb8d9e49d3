package snubber_test

import (
	"context"
	"encoding/json"
	"math"
	"strings"
	"testing"

	"ringbook/snubber"

	"pgregory.net/rapid"
)

func fit(t testing.TB, trials []snubber.Trial) *snubber.FitResult {
	t.Helper()
	f, err := snubber.Fit(context.Background(), trials)
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func asideIDs(f *snubber.FitResult) []string {
	var ids []string
	for _, a := range f.SetAside {
		ids = append(ids, a.Trial)
	}
	return ids
}

// The series is L = 12 nH, C = 180 pF, r = 0.6 ohm, I0 = 4 A (see series).
func holds(t testing.TB, what string, e *snubber.Estimate, truth float64) {
	t.Helper()
	if e == nil {
		t.Fatalf("%s is not told", what)
	}
	// Four standard uncertainties: a seed is fixed, so that this says "right" and not "lucky".
	if math.Abs(e.Value-truth) > 4*e.U || !(e.Low < e.Value && e.Value < e.High) {
		t.Errorf("%s = %+v, made with %g", what, *e, truth)
	}
}

func TestFitFindsTheLoop(t *testing.T) {
	for _, c := range []struct{ trials, caps, resistors int }{{7, 6, 0}, {40, 6, 4}, {200, 12, 0}} {
		f := fit(t, series(c.trials, c.caps, c.resistors, 2))
		holds(t, "L", f.Loop.Inductance, 12e-9)
		holds(t, "C", f.Loop.Capacitance, 180e-12)
		holds(t, "r", f.Loop.Resistance, 0.6)
		holds(t, "Z0", f.Loop.Impedance, math.Sqrt(12e-9/180e-12))
		holds(t, "I0", f.Excitation, 4)
		if len(f.SetAside) > 0 || f.Status != "converged" {
			t.Errorf("%d trials: set aside %v, status %s", c.trials, f.SetAside, f.Status)
		}
	}
}

// One wrong trial of seven is found, named and left out, and the reason says what is wrong with it.
func TestOneWrongTrial(t *testing.T) {
	for what, spoil := range map[string]func(*snubber.Trial){
		"a capacitor one value up":     func(t *snubber.Trial) { t.Network.C *= 1.5 },
		"a capacitor a decade off":     func(t *snubber.Trial) { t.Network.C /= 10 },
		"a frequency read at double":   func(t *snubber.Trial) { t.Readings[0].Value *= 2 },
		"a frequency with wrong digit": func(t *snubber.Trial) { t.Readings[0].Value *= 1.1 },
	} {
		trials := series(7, 6, 0, 3)
		spoil(&trials[4])
		f := fit(t, trials)
		if ids := asideIDs(f); len(ids) != 1 || ids[0] != trials[4].ID {
			t.Errorf("%s: set aside %v, want %s", what, ids, trials[4].ID)
			continue
		}
		if !strings.Contains(f.SetAside[0].Because, "ring_hz") {
			t.Errorf("%s: the reason is %q", what, f.SetAside[0].Because)
		}
		holds(t, what+": L", f.Loop.Inductance, 12e-9)
		holds(t, what+": C", f.Loop.Capacitance, 180e-12)
	}
}

// In a long series, where the test is by the linearised fit, three wrong ones are found, and nothing else goes.
func TestWrongTrialsInALongSeries(t *testing.T) {
	trials := series(300, 10, 0, 4)
	want := map[string]bool{}
	for _, i := range []int{15, 100, 250} {
		trials[i].Readings[0].Value *= 1.08
		want[trials[i].ID] = true
	}
	f := fit(t, trials)
	for _, id := range asideIDs(f) {
		if !want[id] {
			t.Errorf("sound trial %s was set aside", id)
		}
		delete(want, id)
	}
	if len(want) > 0 {
		t.Errorf("not found: %v", want)
	}
}

// Trials that all contradict each other are not explained away: at most a third goes, and a warning says what is left.
func TestNeverMoreThanAThird(t *testing.T) {
	trials := series(9, 8, 0, 5)
	for i := range trials {
		trials[i].Readings[0].Value *= 1 + 0.15*math.Sin(float64(7*i))
	}
	f, err := snubber.Fit(context.Background(), trials)
	if err != nil {
		if !strings.Contains(err.Error(), "contradict") {
			t.Errorf("refused with %q", err)
		}
		return
	}
	if n := len(f.SetAside); n > 3 {
		t.Errorf("%d of 9 set aside", n)
	}
	if len(f.Warnings) == 0 {
		t.Error("no warning")
	}
}

// A trial that did not ring counts through its peak: with the peaks of overdamped networks the excitation is better known.
func TestOverdampedTrialsCount(t *testing.T) {
	trials := series(60, 4, 60, 6)
	var ringing []snubber.Trial
	for _, x := range trials {
		if _, ok := x.Reading(snubber.RingHz); ok {
			ringing = append(ringing, x)
		}
	}
	if len(ringing) == len(trials) {
		t.Fatal("every trial rings")
	}
	all, some := fit(t, trials), fit(t, ringing)
	if all.Excitation.U >= some.Excitation.U {
		t.Errorf("u(I0) = %g with the overdamped trials and %g without", all.Excitation.U, some.Excitation.U)
	}
	if all.Trials != len(trials) || all.DOF <= some.DOF {
		t.Errorf("%d trials and %d degrees of freedom, without them %d and %d", all.Trials, all.DOF, some.Trials, some.DOF)
	}
}

// A part that served in many trials has one error: repeating them does not average it away.
func TestSharedPartIsOneError(t *testing.T) {
	one := series(2, 1, 0, 7)
	var many []snubber.Trial
	for range 50 {
		many = append(many, one...)
	}
	a, b := fit(t, one), fit(t, many)
	tol := 0.05 / math.Sqrt(3)
	for what, f := range map[string]*snubber.FitResult{"once": a, "fifty times": b} {
		if rel := f.Loop.Impedance.U / f.Loop.Impedance.Value; rel < 0.9*tol {
			t.Errorf("%s: Z0 is claimed to %g, the capacitor is known to %g", what, rel, tol)
		}
	}
	// The same values in sessions of their own may be parts of their own.
	for i := range many {
		many[i].Session = string(rune('a' + i%25))
	}
	if c := fit(t, many); c.Loop.Impedance.U > 0.5*b.Loop.Impedance.U {
		t.Errorf("25 parts leave u(Z0) = %g, one %g", c.Loop.Impedance.U, b.Loop.Impedance.U)
	}
}

// A measured part carries its measurement and not its tolerance.
func TestMeasuredPart(t *testing.T) {
	trials := series(2, 1, 0, 8)
	loose := fit(t, trials)
	trials[1].Network.MeasuredC, trials[1].Network.MeasuredU = trials[1].Network.C, trials[1].Network.C*1e-3
	tight := fit(t, trials)
	if tight.Loop.Impedance.U > 0.5*loose.Loop.Impedance.U {
		t.Errorf("u(Z0) = %g measured, %g by tolerance", tight.Loop.Impedance.U, loose.Loop.Impedance.U)
	}
}

// What the trials cannot tell is null, not a guess.
func TestWhatIsNotRead(t *testing.T) {
	strip := func(q snubber.Quantity) []snubber.Trial {
		trials := series(7, 6, 0, 9)
		for i := range trials {
			var kept []snubber.Reading
			for _, r := range trials[i].Readings {
				if r.Quantity != q {
					kept = append(kept, r)
				}
			}
			trials[i].Readings = kept
		}
		return trials
	}
	if f := fit(t, strip(snubber.DecayS)); f.Loop.Resistance != nil {
		t.Errorf("r = %+v without a decay", *f.Loop.Resistance)
	}
	f := fit(t, strip(snubber.PeakV))
	if f.Excitation != nil {
		t.Errorf("I0 = %+v without a peak", *f.Excitation)
	}
	text, err := json.Marshal(f)
	if err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(string(text), `"excitation_a":null`) {
		t.Errorf("JSON %s", text)
	}
}

// Peaks no higher than the bus alone drives them say that the excitation is small, not that the fit has none.
func TestNoExcitation(t *testing.T) {
	loop := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}
	var trials []snubber.Trial
	for i, c := range []float64{0, 100e-12, 220e-12, 470e-12, 1e-9} {
		n := snubber.Network{Kind: snubber.Bare}
		if c > 0 {
			n = snubber.Network{Kind: snubber.C, C: c, CTol: 0.02}
		}
		r, err := snubber.Respond(loop, n, snubber.Excitation{Bus: 48})
		if err != nil {
			t.Fatal(err)
		}
		hz, _ := r.RingHz()
		tau, _ := r.DecayS()
		trials = append(trials, snubber.Trial{ID: string(rune('a' + i)), Board: "b", Revision: "A", Network: n, Point: snubber.OperatingPoint{BusV: 48},
			Readings: []snubber.Reading{{Quantity: snubber.RingHz, Value: hz, U: 1e-3 * hz}, {Quantity: snubber.DecayS, Value: tau, U: 0.02 * tau}, {Quantity: snubber.PeakV, Value: r.Peak().Volts, U: 0.4}}})
	}
	f := fit(t, trials)
	holds(t, "L", f.Loop.Inductance, 12e-9)
	if f.Excitation == nil || f.Excitation.Value != 0 || !(f.Excitation.High > 0 && f.Excitation.High < 3) {
		t.Errorf("I0 = %+v", f.Excitation)
	}
}

// Two operating points have excitations of their own.
func TestOperatingPoints(t *testing.T) {
	a, b := series(7, 6, 0, 10), series(7, 6, 0, 10)
	loop := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}
	for i := range b {
		b[i].ID += "-low"
		b[i].Point.CurrentA = 1
		b[i].Readings = b[i].Readings[:0]
		r, err := snubber.Respond(loop.WithProbe(4e-12), a[i].Network, snubber.Excitation{Bus: 48, Current: 1.5})
		if err != nil {
			t.Fatal(err)
		}
		v := r.Peak().Volts
		b[i].Readings = append(b[i].Readings, snubber.Reading{Quantity: snubber.PeakV, Value: v, U: 0.005 * v})
	}
	f := fit(t, append(a, b...))
	if len(f.Excitations) != 2 {
		t.Fatalf("%d operating points", len(f.Excitations))
	}
	for _, x := range f.Excitations {
		holds(t, "I0", x.Excitation, map[float64]float64{4: 4, 1: 1.5}[x.CurrentA])
	}
}

// Whatever is logged, the answer is an error or finite figures in ordered intervals: never a NaN.
func TestFitNeverNaN(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 8).Draw(t, "n")
		scale := func(name string, typical float64) float64 {
			return typical * math.Pow(10, rapid.Float64Range(-3, 3).Draw(t, name))
		}
		var trials []snubber.Trial
		for range n {
			x := snubber.Trial{ID: "x", Board: "b", Revision: "A", ProbeC: rapid.SampledFrom([]float64{0, 1e-11}).Draw(t, "probe")}
			switch rapid.IntRange(0, 3).Draw(t, "kind") {
			case 0:
				x.Network = snubber.Network{Kind: snubber.Bare}
			case 1, 2:
				x.Network = snubber.Network{Kind: snubber.C, C: scale("c", 4e-10), CTol: rapid.SampledFrom([]float64{0, 1e-6, 0.05, 0.5}).Draw(t, "tol")}
			default:
				x.Network = snubber.Network{Kind: snubber.RC, C: scale("c", 4e-10), R: scale("r", 10)}
			}
			x.Point.BusV = rapid.SampledFrom([]float64{0, 12, 48, 400}).Draw(t, "bus")
			for q, typical := range map[snubber.Quantity]float64{snubber.RingHz: 5e7, snubber.DecayS: 5e-8, snubber.PeakV: 80} {
				if rapid.Bool().Draw(t, string(q)) {
					v := scale(string(q), typical)
					x.Readings = append(x.Readings, snubber.Reading{Quantity: q, Value: v, U: v * rapid.SampledFrom([]float64{0, 1e-6, 0.01, 3}).Draw(t, "u")})
				}
			}
			trials = append(trials, x)
		}
		f, err := snubber.Fit(context.Background(), trials)
		if err != nil {
			return
		}
		for what, e := range map[string]*snubber.Estimate{"L": f.Loop.Inductance, "C": f.Loop.Capacitance, "r": f.Loop.Resistance, "Z0": f.Loop.Impedance, "f0": f.Loop.RingHz, "I0": f.Excitation} {
			if e == nil {
				continue
			}
			for _, v := range []float64{e.Value, e.U, e.Low, e.High} {
				if math.IsNaN(v) || math.IsInf(v, 0) || v < 0 {
					t.Fatalf("%s = %+v", what, *e)
				}
			}
			if e.Low > e.Value || e.Value > e.High {
				t.Fatalf("%s = %+v", what, *e)
			}
		}
		if _, err := json.Marshal(f); err != nil {
			t.Fatal(err)
		}
	})
}

// Uncertainties stated a thousand times too small do not make a confident answer: the intervals widen to what the trials
// scatter, and no sound trial is set aside for it.
func TestUncertaintiesFarTooSmall(t *testing.T) {
	trials := series(8, 7, 0, 11)
	for i := range trials {
		trials[i].Network.CTol = min(trials[i].Network.CTol, 5e-5)
		for k := range trials[i].Readings {
			trials[i].Readings[k].U /= 1000
		}
	}
	f := fit(t, trials)
	if len(f.Warnings) == 0 {
		t.Error("no warning")
	}
	for what, e := range map[string]*snubber.Estimate{"L": f.Loop.Inductance, "C": f.Loop.Capacitance} {
		truth := map[string]float64{"L": 12e-9, "C": 180e-12}[what]
		if math.Abs(e.Value-truth) > 4*e.U {
			t.Errorf("%s = %+v, made with %g", what, *e, truth)
		}
	}
}

// Capacitors all far smaller, or all far larger, than the node's tell little, and the interval says how little.
func TestCapacitorsFarOff(t *testing.T) {
	loop := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.3}
	for what, caps := range map[string][]float64{"small": {1e-12, 1.5e-12, 2.2e-12}, "large": {47e-9, 68e-9, 100e-9}} {
		var trials []snubber.Trial
		for i, c := range append([]float64{0}, caps...) {
			n := snubber.Network{Kind: snubber.Bare}
			if c > 0 {
				n = snubber.Network{Kind: snubber.C, C: c, CTol: 0.05}
			}
			r, err := snubber.Respond(loop, n, snubber.Excitation{Bus: 48, Current: 1})
			if err != nil {
				t.Fatal(err)
			}
			hz, ok := r.RingHz()
			if !ok {
				continue
			}
			off := 1 + 0.003*math.Sin(float64(i*i+1)) // a reading error of the size stated
			trials = append(trials, snubber.Trial{ID: string(rune('a' + i)), Board: "b", Revision: "A", Network: n, Readings: []snubber.Reading{{Quantity: snubber.RingHz, Value: hz * off, U: 0.003 * hz}}})
		}
		f, err := snubber.Fit(context.Background(), trials)
		if err != nil {
			t.Logf("%s: refused: %v", what, err)
			continue
		}
		if e := f.Loop.Inductance; e.Low > 12e-9 || e.High < 12e-9 {
			t.Errorf("%s: L = %+v does not hold 12 nH", what, *e)
		}
		t.Logf("%s: L = %+v", what, *f.Loop.Inductance)
	}
}

// The capacitor suggested next is the one that, once tried, does shrink the uncertainty of Z0 most, by what was promised.
func TestNext(t *testing.T) {
	trials := series(7, 6, 0, 12)
	start := fit(t, trials[:2]) // bare, and one capacitor near the node's own
	if start.Suggestion == nil || start.Suggestion.Enough {
		t.Fatalf("suggestion %+v", start.Suggestion)
	}
	var on []snubber.Candidate
	for _, x := range trials[2:] {
		on = append(on, snubber.Candidate{C: x.Network.C, CTol: x.Network.CTol})
	}
	next := start.Next(on)
	best, least := "", math.Inf(1)
	for _, x := range trials[2:] {
		f := fit(t, append(append([]snubber.Trial{}, trials[:2]...), x))
		rel := f.Loop.Impedance.U / f.Loop.Impedance.Value
		if rel < least {
			best, least = x.ID, rel
		}
		if x.Network.C == next.C {
			near(t, "u(Z0) promised", next.ImpedanceU/start.Loop.Impedance.Value, rel, 0.15)
		}
	}
	for _, x := range trials[2:] {
		if x.Network.C == next.C && x.ID != best {
			f := fit(t, append(append([]snubber.Trial{}, trials[:2]...), x))
			// The readings' own errors move each by a little: it must be as good as the best within that.
			near(t, "u(Z0) of the one suggested", f.Loop.Impedance.U/f.Loop.Impedance.Value, least, 0.05)
		}
	}
	if enough := fit(t, series(60, 40, 0, 12)).Suggestion; enough != nil && !enough.Enough {
		t.Errorf("after sixty trials: %+v", *enough)
	}
}

// L and C share the capacitors' errors with opposite signs, and Z0 carries them: the correlations say so.
func TestCorrelation(t *testing.T) {
	c := fit(t, series(7, 6, 0, 13)).Correlation
	at := map[string]int{}
	for i, name := range c.Of {
		at[name] = i
	}
	r := func(a, b string) float64 { return c.R[at[a]][at[b]] }
	if r("inductance_h", "capacitance_f") > -0.9 || r("inductance_h", "impedance_ohm") < 0.9 || math.Abs(r("impedance_ohm", "ring_hz")) > 0.5 {
		t.Errorf("correlations %+v", *c)
	}
}

// A mislabelled capacitor that served in two trials of eight spoils both, and neither stands alone: both go.
func TestWrongPartInTwoTrials(t *testing.T) {
	trials := series(7, 6, 0, 14)
	again := trials[3]
	again.ID = "trial-again"
	trials = append(trials, again)
	for _, i := range []int{3, 7} {
		trials[i].Network.C *= 1.41
	}
	f := fit(t, trials)
	got := map[string]bool{}
	for _, id := range asideIDs(f) {
		got[id] = true
	}
	if len(got) != 2 || !got[trials[3].ID] || !got[again.ID] {
		t.Errorf("set aside %v", asideIDs(f))
	}
	holds(t, "L", f.Loop.Inductance, 12e-9)
}

// A reading whose uncertainty rests on three repeats widens the interval by Student's t of few degrees of freedom.
func TestFewRepeats(t *testing.T) {
	trials := series(7, 6, 0, 15)
	for i := range trials {
		trials[i].Network.CTol = min(trials[i].Network.CTol, 1e-6) // so that the readings are all there is
	}
	many := fit(t, trials)
	for i := range trials {
		for k, r := range trials[i].Readings {
			d := r.U * math.Sqrt(3) // three repeats whose mean has the standard uncertainty stated
			trials[i].Readings[k].Repeats = []float64{r.Value - d, r.Value, r.Value + d}
		}
	}
	few := fit(t, trials)
	if few.Loop.Inductance.DOF < 2 || few.Loop.Inductance.DOF > 14 || many.Loop.Inductance.DOF != 0 {
		t.Errorf("effective degrees of freedom %g, and %g without repeats", few.Loop.Inductance.DOF, many.Loop.Inductance.DOF)
	}
	width := func(e *snubber.Estimate) float64 { return math.Log(e.High / e.Low) }
	if r := width(few.Loop.Inductance) / width(many.Loop.Inductance); r < 1.05 || r > 2.2 {
		t.Errorf("the interval is %g times as wide", r)
	}
}

// In a long series of parts that serve once each, one with the wrong value on it is set aside as in a short one, whose own
// error the fit would otherwise pull to wherever it explains the reading.
func TestMislabelledInALongSeries(t *testing.T) {
	trials := series(51, 50, 0, 3)
	f := fit(t, trials)
	if len(f.SetAside) != 0 {
		t.Fatalf("a sound series lost %+v", f.SetAside)
	}
	for _, wrong := range []struct {
		at     int
		factor float64
	}{{44, 10}, {20, 0.1}, {7, 1.5}} {
		bad := append([]snubber.Trial{}, trials...)
		bad[wrong.at].Network.C *= wrong.factor
		f := fit(t, bad)
		if len(f.SetAside) != 1 || f.SetAside[0].Trial != bad[wrong.at].ID {
			t.Errorf("%g times its value at trial %d: set aside %+v, chi-square %g for %d", wrong.factor, wrong.at, f.SetAside, f.Chi2, f.DOF)
		}
	}
}
