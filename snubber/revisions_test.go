package snubber_test

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"

	"ringbook/snubber"
)

// rev is a made-up revision: its loop as the ring sees it, and the current its switch lets go.
type rev struct {
	name string
	loop snubber.Loop
	amps float64
}

var (
	revA = rev{"A", snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}, 4}
	revB = rev{"B", snubber.Loop{Inductance: 9.5e-9, Capacitance: 200e-12, Resistance: 0.5}, 4.4}
)

var pointAB = snubber.OperatingPoint{BusV: 48, CurrentA: 4}

// drawer is a set of capacitors: what is written on them, and by what factor that is wrong.
type drawer struct {
	name string
	off  []float64
}

var written = []float64{120e-12, 220e-12, 390e-12, 560e-12, 820e-12, 1200e-12}

const drawerTol = 0.05

// aDrawer draws capacitors with rectangular errors within their tolerance.
func aDrawer(rng *rand.Rand, name string) drawer {
	d := drawer{name: name}
	for range written {
		d.off = append(d.off, 1+drawerTol*(2*rng.Float64()-1))
	}
	return d
}

// trials are those of a revision bare and with each capacitor of a drawer, read with normal errors.
func (v rev) trials(rng *rand.Rand, d drawer) []snubber.Trial {
	var out []snubber.Trial
	for i := -1; i < len(written); i++ {
		n := snubber.Network{Kind: snubber.Bare}
		is := n
		t := snubber.Trial{ID: v.name + strconv.Itoa(i), Board: "b", Revision: v.name, ProbeC: 4e-12, Point: pointAB}
		if i >= 0 {
			n = snubber.Network{Kind: snubber.C, C: written[i], CTol: drawerTol}
			is = n
			is.C *= d.off[i]
			if d.name != "" {
				t.Part = d.name + " " + strconv.Itoa(i)
			}
		}
		t.Network = n
		r, err := snubber.Respond(v.loop.WithProbe(4e-12), is, snubber.Excitation{Bus: pointAB.BusV, Current: v.amps})
		if err != nil {
			panic(err)
		}
		read := func(q snubber.Quantity, x, rel float64) {
			t.Readings = append(t.Readings, snubber.Reading{Quantity: q, Value: x * (1 + rel*rng.NormFloat64()), U: x * rel})
		}
		hz, _ := r.RingHz()
		tau, _ := r.DecayS()
		read(snubber.RingHz, hz, 0.002)
		read(snubber.DecayS, tau, 0.02)
		read(snubber.PeakV, r.Peak().Volts, 0.005)
		out = append(out, t)
	}
	return out
}

// truth is a revision's quantities by the names of Difference, with the capacitance as a factor of rest has it.
func (v rev) truth(rest float64) map[string]float64 {
	l := v.loop
	l.Capacitance *= rest
	r, err := snubber.Respond(l, snubber.Network{Kind: snubber.Bare}, snubber.Excitation{Bus: pointAB.BusV, Current: v.amps})
	if err != nil {
		panic(err)
	}
	return map[string]float64{"inductance_h": l.Inductance, "capacitance_f": l.Capacitance, "impedance_ohm": l.Impedance(), "resistance_ohm": l.Resistance,
		"ring_hz": l.NaturalHz(), "excitation_a": v.amps, "peak_v": r.Peak().Volts}
}

func compare(t testing.TB, sets ...[]snubber.Trial) *snubber.Comparison {
	t.Helper()
	c, err := snubber.CompareRevisions(context.Background(), sets, pointAB)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// difference is that of a quantity from the first revision to another.
func difference(t testing.TB, c *snubber.Comparison, quantity, to string) snubber.Difference {
	t.Helper()
	for _, d := range c.Differences {
		if d.Quantity == quantity && d.To == to {
			return d
		}
	}
	t.Fatalf("no difference of %s to %s in %+v", quantity, to, c.Differences)
	return snubber.Difference{}
}

// 2,000 pairs of boards, with parts and readings drawn as stated: the intervals of the differences hold the true difference
// 95 times in 100, whether the revisions share their capacitors or not; sharing them makes what those carry, L and C, much
// better known. The node's capacitance at rest is drawn as the fit allows for it.
func TestRevisionIntervalsCover(t *testing.T) {
	pairs := 2000
	if testing.Short() {
		pairs = 200
	}
	width := map[string]map[bool]float64{}
	for _, shared := range []bool{false, true} {
		rng := rand.New(rand.NewPCG(7, 1))
		held, relative, n := map[string]int{}, map[string]int{}, map[string]int{}
		for range pairs {
			a, b := aDrawer(rng, "blue"), aDrawer(rng, "green")
			if shared {
				b = a
			}
			c := compare(t, revA.trials(rng, a), revB.trials(rng, b))
			from, to := revA.truth(1+0.005*rng.NormFloat64()), revB.truth(1+0.005*rng.NormFloat64())
			for _, d := range c.Differences {
				n[d.Quantity]++
				if x := to[d.Quantity] - from[d.Quantity]; d.Delta.Low <= x && x <= d.Delta.High {
					held[d.Quantity]++
				}
				if x := to[d.Quantity]/from[d.Quantity] - 1; d.Relative.Low <= x && x <= d.Relative.High {
					relative[d.Quantity]++
				}
				if width[d.Quantity] == nil {
					width[d.Quantity] = map[bool]float64{}
				}
				width[d.Quantity][shared] += d.Relative.U / float64(pairs)
			}
		}
		for q := range revA.truth(1) {
			if n[q] < pairs*99/100 {
				t.Errorf("shared %v: %s was told %d times of %d", shared, q, n[q], pairs)
			}
			share, rel := float64(held[q])/float64(n[q]), float64(relative[q])/float64(n[q])
			t.Logf("shared %v: %-15s %.1f %% (relative %.1f %%), mean u %.3f %%", shared, q, 100*share, 100*rel, 100*width[q][shared])
			off := 0.02
			if testing.Short() {
				off = 0.05
			}
			if math.Abs(share-0.95) > off || math.Abs(rel-0.95) > off {
				t.Errorf("shared %v: the intervals of %s hold the truth in %.1f %%, the relative ones in %.1f %%", shared, q, 100*share, 100*rel)
			}
		}
	}
	for q, most := range map[string]float64{"inductance_h": 0.4, "capacitance_f": 0.55, "impedance_ohm": 0.4, "ring_hz": 1.01} {
		if r := width[q][true] / width[q][false]; r > most {
			t.Errorf("%s: shared parts leave %.2f of the uncertainty, want at most %.2f", q, r, most)
		}
	}
}

// Where two revisions are equal the probability that a difference is real is as often above any p as it should be: between
// 0.5 and 1 all values are as frequent.
func TestProbabilityReal(t *testing.T) {
	const pairs = 1000
	twin := revA
	twin.name = "B"
	rng := rand.New(rand.NewPCG(8, 1))
	above := map[string]map[float64]int{}
	for range pairs {
		d := aDrawer(rng, "blue")
		c := compare(t, revA.trials(rng, d), twin.trials(rng, d))
		for _, x := range c.Differences {
			if above[x.Quantity] == nil {
				above[x.Quantity] = map[float64]int{}
			}
			for _, p := range []float64{0.6, 0.75, 0.9, 0.975} {
				if x.ProbabilityReal > p {
					above[x.Quantity][p]++
				}
			}
			if low := x.Delta.Low > 0 || x.Delta.High < 0; low != (x.ProbabilityReal > 0.975) && math.Abs(x.ProbabilityReal-0.975) > 1e-4 {
				t.Errorf("%s: interval %+v, probability %g", x.Quantity, *x.Delta, x.ProbabilityReal)
			}
		}
	}
	for _, q := range []string{"inductance_h", "resistance_ohm"} { // nothing but readings and parts in their errors
		for p, n := range above[q] {
			want := 2 * (1 - p) * pairs
			if math.Abs(float64(n)-want) > 4*math.Sqrt(want*(1-want/pairs)) {
				t.Errorf("%s: above %g in %d of %d, want about %.0f", q, p, n, pairs, want)
			}
		}
	}
}

// With nothing in common the fit of all is that of each alone, and uncertainties add as independent ones do (GUM 5.1.2).
func TestRevisionsApart(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 1))
	for _, names := range [][2]string{{"blue", "green"}, {"", ""}} {
		c := compare(t, revA.trials(rng, aDrawer(rng, names[0])), revB.trials(rng, aDrawer(rng, names[1])))
		if len(c.SharedParts) != 0 {
			t.Errorf("%q: shared %+v", names, c.SharedParts)
		}
		for k, r := range c.Revisions {
			f := c.Fits[k]
			near(t, "L", r.Loop.Inductance.Value, f.Loop.Inductance.Value, 1e-6)
			near(t, "u(L)", r.Loop.Inductance.U, f.Loop.Inductance.U, 1e-4)
			near(t, "C", r.Loop.Capacitance.Value, f.Loop.Capacitance.Value, 1e-6)
			near(t, "u(C)", r.Loop.Capacitance.U, f.Loop.Capacitance.U, 1e-4)
			near(t, "high(C)", r.Loop.Capacitance.High, f.Loop.Capacitance.High, 1e-4)
			near(t, "r", r.Loop.Resistance.Value, f.Loop.Resistance.Value, 1e-6)
			near(t, "I0", r.Excitation.Value, f.Excitation.Value, 1e-6)
			near(t, "u(I0)", r.Excitation.U, f.Excitation.U, 1e-4)
		}
		a, b := c.Fits[0].Loop, c.Fits[1].Loop
		d := difference(t, c, "impedance_ohm", "B")
		near(t, "Z0", d.Delta.Value, b.Impedance.Value-a.Impedance.Value, 1e-5)
		near(t, "u(Z0)", d.Delta.U, math.Hypot(a.Impedance.U, b.Impedance.U), 1e-3)
		if !strings.Contains(strings.Join(c.Warnings, "\n"), "several revisions (6 times)") {
			t.Errorf("%q: nothing is said of the parts that may be the same: %q", names, c.Warnings)
		}
	}
}

// The bare peak of a revision is Ahead's where nothing is shared, and its uncertainty that of Ahead's draws.
func TestRevisionPeaks(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 1))
	c := compare(t, revA.trials(rng, aDrawer(rng, "blue")), revB.trials(rng, aDrawer(rng, "green")))
	for k, r := range c.Revisions {
		p, _, err := c.Fits[k].Ahead(pointAB, 0, 1)
		if err != nil {
			t.Fatal(err)
		}
		resp, err := snubber.Respond(p.Loop, snubber.Network{Kind: snubber.Bare}, p.Excitation)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "peak", r.Peak.Value, resp.Peak().Volts, 1e-6)
		drawn, err := snubber.PeakSpread(c.Fits[k], pointAB, 4000)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "u(peak)", r.Peak.U, drawn, 0.05)
	}
	if len(c.SharedParts) != 0 {
		t.Errorf("shared %+v", c.SharedParts)
	}

	// At another point the load current stands in, with a warning by revision; with no bus there are no peaks.
	sets := [][]snubber.Trial{revA.trials(rng, aDrawer(rng, "blue")), revB.trials(rng, aDrawer(rng, "blue"))}
	far, err := snubber.CompareRevisions(context.Background(), sets, snubber.OperatingPoint{BusV: 48, CurrentA: 8})
	if err != nil {
		t.Fatal(err)
	}
	said := strings.Join(far.Warnings, "\n")
	if far.Revisions[0].Excitation != nil || far.Revisions[0].Peak == nil || !strings.Contains(said, "peak of A: no peak was read at this operating point") ||
		!strings.Contains(said, "peak of B: no peak") {
		t.Errorf("%+v, warnings %q", far.Revisions[0], far.Warnings)
	}
	for _, at := range []snubber.OperatingPoint{{}, {BusV: 20}} {
		none, err := snubber.CompareRevisions(context.Background(), sets, at)
		if err != nil {
			t.Fatal(err)
		}
		if none.Revisions[1].Peak != nil || !strings.Contains(strings.Join(none.Warnings, "\n"), "peak of B: not predicted") {
			t.Errorf("at %+v: %+v, warnings %q", at, none.Revisions[1], none.Warnings)
		}
	}
}

// Words that stand for two different capacitors are found out where the readings can tell, and the part is then taken for
// two; the difference of the loops stays right.
func TestNotTheSamePart(t *testing.T) {
	for seed := range uint64(5) {
		rng := rand.New(rand.NewPCG(seed, 1))
		d := aDrawer(rng, "blue")
		other := drawer{"blue", append([]float64{}, d.off...)}
		d.off[3], other.off[3] = 0.96, 1.04 // both within their tolerance
		c := compare(t, revA.trials(rng, d), revB.trials(rng, other))
		if said := strings.Join(c.Warnings, "\n"); !strings.Contains(said, "560 pF (part blue 3) cannot be the same on B") {
			t.Errorf("seed %d: warnings %q, set aside %+v", seed, c.Warnings, c.Fits[1].SetAside)
		}
		if said := strings.Join(c.Warnings, "\n"); strings.Contains(said, "neither a part") {
			t.Errorf("seed %d: warnings %q", seed, c.Warnings)
		}
		if n := len(c.SharedParts); n != 5 {
			t.Errorf("seed %d: %d parts are shared", seed, n)
		}
		x := difference(t, c, "inductance_h", "B")
		if want := -2.5e-9; math.Abs(x.Delta.Value-want) > 4*x.Delta.U {
			t.Errorf("seed %d: difference %+v, made with %g", seed, *x.Delta, want)
		}
		if c.Status != "converged" {
			t.Errorf("seed %d: %s", seed, c.Status)
		}
	}
}

// Words that are no good at all, the same for two drawers of capacitors: nothing is taken to be shared, and the differences are
// as uncertain as without.
func TestNoneTheSame(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 1))
	a, b := aDrawer(rng, "blue"), aDrawer(rng, "blue")
	for i := range b.off {
		a.off[i], b.off[i] = 1+0.04*math.Cos(2*float64(i)), 1-0.04*math.Cos(2*float64(i))
	}
	c := compare(t, revA.trials(rng, a), revB.trials(rng, b))
	if len(c.SharedParts) > 0 || !strings.Contains(c.Warnings[0], "of 6 parts that should be the same on several revisions more than a third cannot be") {
		t.Errorf("shared %+v, warnings %q", c.SharedParts, c.Warnings)
	}
	d := difference(t, c, "impedance_ohm", "B")
	near(t, "u(Z0)", d.Delta.U, math.Hypot(c.Fits[0].Loop.Impedance.U, c.Fits[1].Loop.Impedance.U), 1e-3)
}

// Resistors are shared as capacitors are, and equal readings make no difference.
func TestSharedResistors(t *testing.T) {
	var sets [3][]snubber.Trial
	for k := range sets {
		sets[k] = series(40, 6, 4, 2)
		for i := range sets[k] {
			sets[k][i].Revision = string(rune('A' + k))
			sets[k][i].Session = "one sitting"
			if k == 2 {
				sets[k][i].Session = "another"
			}
		}
	}
	c := compare(t, sets[:]...)
	if len(c.SharedParts) != 10 || c.SharedParts[9].R == 0 || c.SharedParts[9].Known != "session one sitting" || len(c.SharedParts[9].Revisions) != 2 {
		t.Errorf("shared %+v", c.SharedParts)
	}
	for _, q := range []string{"inductance_h", "resistance_ohm", "impedance_ohm"} {
		same, other := difference(t, c, q, "B"), difference(t, c, q, "C")
		if math.Abs(same.Delta.Value) > 1e-3*same.Delta.U || math.Abs(same.ProbabilityReal-0.5) > 1e-3 || math.Abs(same.Relative.Value) > 1e-3 {
			t.Errorf("%s: %+v, probability %g", q, *same.Delta, same.ProbabilityReal)
		}
		if same.Delta.U > 0.999*other.Delta.U {
			t.Errorf("%s: u = %g with shared parts, %g with others", q, same.Delta.U, other.Delta.U)
		}
	}
}

// Five revisions, all with the same capacitors: four differences of each quantity, each right; the order is that given.
func TestFiveRevisions(t *testing.T) {
	revs, sets := five(9)
	c := compare(t, sets...)
	if len(c.Differences) != 4*7 || len(c.SharedParts) != 6 || len(c.SharedParts[0].Revisions) != 5 {
		t.Fatalf("%d differences, shared %+v", len(c.Differences), c.SharedParts)
	}
	if c.SharedParts[0].Known != "part blue 0" || c.SharedParts[0].C != 120e-12 || c.SharedParts[0].R != 0 {
		t.Errorf("%+v", c.SharedParts[0])
	}
	from := revs[0].truth(1)
	for k, v := range revs[1:] {
		to := v.truth(1)
		for _, d := range c.Differences[7*k : 7*k+7] {
			if d.From != "R0" || d.To != v.name {
				t.Errorf("from %s to %s, want %s", d.From, d.To, v.name)
			}
			if want := to[d.Quantity] - from[d.Quantity]; math.Abs(d.Delta.Value-want) > 4*d.Delta.U {
				t.Errorf("%s of %s: %+v, made with %g", d.Quantity, v.name, *d.Delta, want)
			}
		}
	}
}

func five(seed uint64) (revs []rev, sets [][]snubber.Trial) {
	rng := rand.New(rand.NewPCG(seed, 1))
	d := aDrawer(rng, "blue")
	for k := range 5 {
		v := revA
		v.name = fmt.Sprintf("R%d", k)
		v.loop.Inductance -= 0.8e-9 * float64(k)
		v.loop.Capacitance += 5e-12 * float64(k)
		revs, sets = append(revs, v), append(sets, v.trials(rng, d))
	}
	return revs, sets
}

// A revision whose trials scatter widens its own differences alone.
func TestScatterOfOneRevision(t *testing.T) {
	revs, sets := five(9)
	plain := compare(t, sets...)
	for i := range sets[1] {
		sets[1][i].Readings[1].Value *= 1 + 0.08*math.Cos(2.5*float64(i)) // the decays
	}
	c := compare(t, sets...)
	ratio := func(k int) float64 {
		q := "resistance_ohm"
		return difference(t, c, q, revs[k].name).Delta.U / difference(t, plain, q, revs[k].name).Delta.U
	}
	if ratio(1) < 1.3 || math.Abs(ratio(2)-1) > 0.05 {
		t.Errorf("u of the difference grows by %.2f for the revision that scatters and %.2f for another", ratio(1), ratio(2))
	}
	if x := difference(t, c, "resistance_ohm", "R1").Delta; x.DOF == 0 {
		t.Errorf("%+v has no degrees of freedom", *x)
	}
	near(t, "u(r) of the fit alone", c.Revisions[1].Loop.Resistance.U, c.Fits[1].Loop.Resistance.U, 0.05)
}

// The effects are each revision's own: here the second's switch lets go over a time, the first's at once.
func TestEffectOfOneRevision(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 1))
	d := aDrawer(rng, "blue")
	a := revA.trials(rng, d)
	b := revB.trials(rng, d)
	for i := range b {
		n := b[i].Network
		if n.Kind == snubber.C {
			n.C *= d.off[i-1]
		}
		v := snubber.PeakWithFall(revB.loop.WithProbe(4e-12), n, snubber.Excitation{Bus: pointAB.BusV, Current: revB.amps}, 5e-9)
		b[i].Readings[2].Value, b[i].Readings[2].U = v*(1+0.002*rng.NormFloat64()), 0.002*v
	}
	c := compare(t, a, b)
	if len(c.Fits[0].Effects) != 0 || len(c.Fits[1].Effects) != 1 {
		t.Fatalf("effects %+v and %+v", c.Fits[0].Effects, c.Fits[1].Effects)
	}
	if len(c.SharedParts) != 6 {
		t.Errorf("shared %+v", c.SharedParts)
	}
	for q, want := range map[string]float64{"inductance_h": -2.5e-9, "excitation_a": 0.4} {
		if x := difference(t, c, q, "B").Delta; math.Abs(x.Value-want) > 4*x.U {
			t.Errorf("%s: %+v, made with %g", q, *x, want)
		}
	}
	// The falling current takes some of the peak: the prediction must know.
	bare, _ := b[0].Reading(snubber.PeakV)
	if p := c.Revisions[1].Peak; math.Abs(p.Value/bare.Value-1) > 0.03 {
		t.Errorf("peak %+v, read %g (with a probe)", *p, bare.Value)
	}
}

func TestCompareRefuses(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 1))
	a, b := revA.trials(rng, aDrawer(rng, "")), revB.trials(rng, aDrawer(rng, ""))
	mixed := append(append([]snubber.Trial{}, a...), b[0])
	struck := append([]snubber.Trial{}, b...)
	for i := range struck {
		struck[i].Struck = "wrong"
	}
	for what, c := range map[string]struct {
		sets [][]snubber.Trial
		want string
	}{
		"nothing":          {nil, "0 revisions given"},
		"one":              {[][]snubber.Trial{a}, "1 revision given, where it takes two"},
		"an empty set":     {[][]snubber.Trial{a, {}}, "set 2 of trials: no trial"},
		"all struck":       {[][]snubber.Trial{a, struck}, "b B: no trial in scope stands"},
		"two in one":       {[][]snubber.Trial{b, mixed}, "b A: the trials are of two revisions"},
		"the same twice":   {[][]snubber.Trial{a, a}, "b A is given twice"},
		"one bare trial":   {[][]snubber.Trial{a, b[:1]}, "b B: "},
		"nothing readable": {[][]snubber.Trial{a, {{Board: "b", Revision: "B", Network: snubber.Network{Kind: snubber.Bare}}}}, "b B: no trial in scope has a reading"},
	} {
		_, err := snubber.CompareRevisions(context.Background(), c.sets, pointAB)
		if err == nil || !strings.Contains(err.Error(), c.want) || !strings.HasPrefix(err.Error(), "comparing revisions: ") {
			t.Errorf("%s: %v does not say %q", what, err, c.want)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := snubber.CompareRevisions(ctx, [][]snubber.Trial{a, b}, pointAB); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

// The names in JSON, and that all of it can be written: no infinity, no NaN.
func TestComparisonJSON(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 1))
	b := revB.trials(rng, aDrawer(rng, "blue"))
	for i := range b {
		b[i].Board = "c"
	}
	text, err := json.Marshal(compare(t, revA.trials(rng, aDrawer(rng, "blue")), b))
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{`"from":"b A","to":"c B"`, `"quantity":"inductance_h"`, `"probability_real":`, `"relative":{`, `"shared_parts":[{"known_by":"part blue 0","c_f":1.2e-10,"r_ohm":0,"revisions":["b A","c B"]}`, `"peak_v":{`} {
		if !strings.Contains(string(text), want) {
			t.Errorf("%s is not in %s", want, text)
		}
	}
}

// The bus at which a capacitance is stated counts.
func TestRevisionsAtDifferentBuses(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 1))
	b := revB.trials(rng, aDrawer(rng, "blue"))
	for i := range b {
		b[i].Point.BusV = 40
		b[i].Readings = b[i].Readings[:2]
	}
	c := compare(t, revA.trials(rng, aDrawer(rng, "blue")), b)
	if !strings.Contains(strings.Join(c.Warnings, "\n"), "read both at one bus") {
		t.Errorf("%q", c.Warnings)
	}
}

func BenchmarkCompareRevisions(b *testing.B) {
	_, sets := five(1)
	for _, n := range []int{2, 5} {
		b.Run(fmt.Sprintf("%dx7", n), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, err := snubber.CompareRevisions(context.Background(), sets[:n], pointAB); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
