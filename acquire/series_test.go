package acquire

import (
	"context"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"
	"testing"
	"time"

	"ringbook/snubber"
	"ringbook/snubber/waveform"
)

// made is a bench made for these tests, with a board that answers by the closed form. It fails the test when anything is
// moved or touched while the bus is charged.
type made struct {
	t        *testing.T
	hands    bool // a person switches the supply; the rig reads the bus
	fits     bool // the rig fits networks
	on       bool
	v        float64 // V of the bus
	stuck    bool    // it never discharges
	across   map[string]float64
	really   map[string]float64 // F: what parts really are, by name
	onFails  error
	offFails error
	takeFail []error // of the next takes; nil: none
	log      []string
}

func (b *made) Provides() []snubber.Quantity {
	return []snubber.Quantity{snubber.RingHz, snubber.DecayS, snubber.PeakV, snubber.BusV}
}
func (b *made) CanSwitch() bool { return !b.hands }
func (b *made) CanFit() bool    { return b.fits }

func (b *made) Switch(ctx context.Context, on bool) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	b.log = append(b.log, fmt.Sprintf("switch %v", on))
	if on {
		if b.on, b.v = true, 48; b.onFails != nil {
			return b.onFails
		}
		return nil
	}
	if b.offFails != nil {
		return b.offFails
	}
	b.on = false
	return nil
}

func (b *made) Discharged(ctx context.Context, limit float64, within time.Duration, progress func(float64)) error {
	for range 20 {
		if progress(b.v); !b.on && b.v < limit {
			return ctx.Err()
		}
		if !b.on && !b.stuck {
			b.v /= 2
		}
	}
	return fmt.Errorf("%w: %g V", ErrStillCharged, b.v)
}

// touch is a hand or a relay at the node.
func (b *made) touch(what string) {
	b.t.Helper()
	b.log = append(b.log, what)
	if b.on || b.v >= 5 {
		b.t.Errorf("%s with the supply on %v and the bus at %g V", what, b.on, b.v)
	}
}

func (b *made) Fit(ctx context.Context, n snubber.Network) error {
	b.touch("rig fits " + describePart(n, ""))
	b.across = map[string]float64{"": n.C}
	return ctx.Err()
}

func (b *made) SwitchPart(ctx context.Context, p Part, in bool) error {
	b.touch(fmt.Sprintf("relay %s %v", p.Name, in))
	if delete(b.across, p.Name); in {
		b.across[p.Name] = p.Value
	}
	return ctx.Err()
}

// hand is a person who fits a part.
func (b *made) hand(name string, c float64) {
	b.touch("hand " + name)
	b.across = map[string]float64{name: c}
}

func (b *made) take(_ context.Context, t snubber.Trial) (snubber.Trial, []waveform.Record, []string, error) {
	if len(b.takeFail) > 0 {
		err := b.takeFail[0]
		if b.takeFail = b.takeFail[1:]; err != nil {
			return t, nil, nil, err
		}
	}
	if !b.on {
		b.t.Error("a trial is read with the supply off")
	}
	if len(b.across) > 1 {
		b.t.Errorf("parts across the node together: %v", b.across)
	}
	c := 0.0
	for name, nominal := range b.across {
		if real, ok := b.really[name]; ok {
			nominal = real
		}
		c += nominal
	}
	n := snubber.Network{Kind: snubber.Bare}
	if c > 0 {
		n = snubber.Network{Kind: snubber.C, C: c}
	}
	r, err := snubber.Respond(snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.6}, n, snubber.Excitation{Bus: 48, Current: 4})
	if err != nil {
		return t, nil, nil, err
	}
	hz, _ := r.RingHz()
	tau, _ := r.DecayS()
	t.Readings = []snubber.Reading{{Quantity: snubber.RingHz, Value: hz, U: 0.002 * hz}, {Quantity: snubber.DecayS, Value: tau, U: 0.02 * tau},
		{Quantity: snubber.PeakV, Value: r.Peak().Volts, U: 0.005 * r.Peak().Volts}, {Quantity: snubber.BusV, Value: 48, U: 0.02}}
	return t, nil, nil, nil
}

// sitting is a series on a made bench with a logbook in memory.
type sitting struct {
	*Series
	bench  *made
	logged []snubber.Trial
	struck map[string]string
	asked  []Question
	told   []Event
}

// sit begins a series whose answers are given; more are the end. A person does what the question says, or what they answer.
func sit(t *testing.T, b *made, answers ...string) *sitting {
	b.t = t
	s := &sitting{bench: b, struck: map[string]string{}}
	b.across = map[string]float64{}
	s.Series = &Series{
		Bench: b, Tol: 0.05, SafeV: 5, Within: time.Second, Trial: snubber.Trial{Board: "b", Revision: "A", Session: "one"},
		Usual: func(*snubber.FitResult) []Part {
			return []Part{{Value: 100e-12, Tol: 0.05}, {Value: 220e-12, Tol: 0.05}, {Value: 470e-12, Tol: 0.05}, {Value: 1e-9, Tol: 0.05}}
		},
		Ask: func(ctx context.Context, q Question) (string, error) {
			if s.asked = append(s.asked, q); len(answers) == 0 {
				return "", io.EOF
			}
			a := answers[0]
			answers = answers[1:]
			switch q.Kind {
			case FitPart:
				s.handle(q, a)
			case SwitchOn:
				b.on, b.v = true, 48
			case MakeSafe:
				b.on = a == "forgot"
				a = strings.TrimPrefix(a, "forgot")
			}
			return a, ctx.Err()
		},
		Take: b.take,
		Log: func(_ context.Context, t snubber.Trial, _ []waveform.Record) (string, error) {
			t.ID = fmt.Sprintf("trial-%d", len(s.logged)+1)
			s.logged = append(s.logged, t)
			b.log = append(b.log, "log")
			return t.ID, nil
		},
		Strike: func(_ context.Context, id, because string) error {
			s.struck[id] = because
			return nil
		},
		Tell: func(e Event) { s.told = append(s.told, e) },
	}
	return s
}

// handle is the person's hands: they fit the part whose value stands in the question, or that they answer.
func (s *sitting) handle(q Question, answer string) {
	if s.bench.fits || strings.Contains(q.Text, "switches") || slices.Contains([]string{"skip", "again", "done"}, answer) {
		return
	}
	if p, err := s.part(answer); err == nil {
		s.bench.hand(p.Name, p.Value)
		return
	}
	for _, p := range append(s.Usual(nil), s.Drawer...) {
		if strings.HasPrefix(q.Text, "Fit "+describePart(p.Network(), p.Name)+" ") {
			s.bench.hand(p.Name, p.Value)
		}
	}
	if strings.Contains(q.Text, "bare") || answer == "bare" {
		s.bench.hand("", 0)
	}
}

// networks are the trials logged that stand, in words.
func (s *sitting) networks() string {
	var all []string
	for _, t := range s.logged {
		if s.struck[t.ID] == "" {
			all = append(all, strings.TrimPrefix(describePart(t.Network, t.Part), "the "))
		}
	}
	return strings.Join(all, ", ")
}

func (s *sitting) run(t *testing.T) (SeriesResult, error) {
	t.Helper()
	r, err := s.Run(t.Context())
	if s.bench.on && !s.bench.hands && s.bench.offFails == nil {
		t.Error("the supply is left on")
	}
	return r, err
}

func TestSeries(t *testing.T) {
	s := sit(t, &made{}, slices.Repeat([]string{""}, 9)...)
	r, err := s.run(t)
	if err != nil || r.Fit == nil || !r.Enough {
		t.Fatalf("%+v, %v", r, err)
	}
	if got := s.networks(); !strings.HasPrefix(got, "bare node, 470 pF, ") {
		t.Errorf("it went %s", got)
	}
	l := r.Fit.Loop
	if l.Inductance.Low > 12e-9 || l.Inductance.High < 12e-9 {
		t.Errorf("the loop is %v", l.Inductance)
	}
	// A trial is logged before anything else is asked or fitted, with the supply off again.
	want := "switch false, hand , switch true, switch false, log, switch false, hand "
	if got := strings.Join(s.bench.log[:7], ", "); got != want {
		t.Errorf("the bench saw %s", got)
	}
}

func TestSeriesByHand(t *testing.T) {
	s := sit(t, &made{hands: true, on: true, v: 48}, "forgot", "", "", "", "", "done")
	r, err := s.run(t)
	if err != nil || s.networks() != "bare node" || r.Ended != "as asked" {
		t.Errorf("%s, %+v, %v", s.networks(), r, err)
	}
	var kinds []string
	for _, q := range s.asked {
		kinds = append(kinds, string(q.Kind))
	}
	if got := strings.Join(kinds, ", "); got != "make safe, make safe, fit, switch on, make safe, fit" {
		t.Errorf("asked %s", got)
	}
	if !strings.Contains(s.asked[1].Text, "48 V") {
		t.Errorf("asked %q of a supply that is on", s.asked[1].Text)
	}
}

func TestSeriesAnswers(t *testing.T) {
	s := sit(t, &made{}, "", "skip", "330p 2%", "again", "what?", "C9", "bare", "done")
	if _, err := s.run(t); err != nil {
		t.Fatal(err)
	}
	if got := s.networks(); got != "bare node, 330 pF, 330 pF, bare node" {
		t.Errorf("it went %s", got)
	}
	if n := s.logged[1].Network; n.CTol != 0.02 {
		t.Errorf("330p 2%% is %+v", n)
	}
	misunderstood := 0
	for _, q := range s.asked {
		if q.Again != "" {
			misunderstood++
		}
	}
	if misunderstood != 2 {
		t.Errorf("%d answers were not understood, and two were none", misunderstood)
	}
}

// A part that is not what its bag says is asked about at once, and the person's answer is what stands.
func TestSeriesInDoubt(t *testing.T) {
	for _, x := range []struct {
		answers []string
		want    string // the trials that stand
	}{
		{[]string{""}, "bare node, 220 pF, 1 nF, 470 pF"},
		{[]string{"keep"}, "bare node, 220 pF, 1 nF, 470 pF"},
		{[]string{"47p"}, "bare node, 220 pF, 1 nF, 47 pF"},
		{[]string{"wrong"}, "bare node, 220 pF, 1 nF"},
		{[]string{"again", "wrong"}, "bare node, 220 pF, 1 nF"},
		{[]string{"again", "47p"}, "bare node, 220 pF, 1 nF, 47 pF"},
		{[]string{"1000"}, "bare node, 220 pF, 1 nF, 470 pF"},
	} {
		b := &made{really: map[string]float64{}}
		s := sit(t, b, append([]string{"", "220p", "1n", "470p"}, x.answers...)...)
		s.All = true
		s.Take = func(ctx context.Context, t snubber.Trial) (snubber.Trial, []waveform.Record, []string, error) {
			if t.Network.C == 470e-12 {
				b.really[""] = 47e-12
			}
			return b.take(ctx, t)
		}
		if _, err := s.run(t); err != nil {
			t.Fatal(err)
		}
		if got := s.networks(); got != x.want {
			t.Errorf("%v: %s stand, want %s", x.answers, got, x.want)
		}
		i := slices.IndexFunc(s.asked, func(q Question) bool { return q.Kind == InDoubt })
		if i < 0 || !strings.Contains(s.asked[i].Text, "really 470 pF") || !strings.Contains(s.asked[i].Why, "47.") {
			t.Errorf("asked %+v", s.asked)
		}
		if n := slices.IndexFunc(s.logged, func(t snubber.Trial) bool { return t.Network.C == 470e-12 }); n != 3 {
			t.Errorf("the trial was logged as number %d, before the question", n)
		}
	}
}

// Of two capacitors that contradict each other either may be the wrong one.
func TestSeriesInDoubtOfTwo(t *testing.T) {
	b := &made{really: map[string]float64{"A": 47e-12}}
	s := sit(t, b, "", "A", "B", "done")
	s.Drawer = []Part{{Name: "A", Value: 470e-12, Tol: 0.05}, {Name: "B", Value: 1e-9, Tol: 0.05}}
	if _, err := s.run(t); err != nil {
		t.Fatal(err)
	}
	if q := s.asked[len(s.asked)-1]; q.Kind != InDoubt || !strings.Contains(q.Text, "1 nF (B)") || !strings.Contains(q.Why, "unless 470 pF (A) is what is not as it says") {
		t.Errorf("asked %+v", q)
	}
}

// What a part may be off is its tolerance, or how well it was measured; beyond that it is in doubt.
func TestDoubtOfAPart(t *testing.T) {
	b := &made{t: t, on: true, across: map[string]float64{}}
	trial := func(n snubber.Network, really float64) snubber.Trial {
		b.across = map[string]float64{"": really}
		got, _, _, err := b.take(t.Context(), snubber.Trial{Board: "b", Revision: "A", Network: n})
		if err != nil {
			t.Fatal(err)
		}
		return got
	}
	measured := func(c float64) snubber.Network {
		return snubber.Network{Kind: snubber.C, C: c, MeasuredC: c, MeasuredU: 0.005 * c}
	}
	before, err := snubber.Fit(t.Context(), []snubber.Trial{trial(snubber.Network{Kind: snubber.Bare}, 0), trial(measured(220e-12), 220e-12), trial(measured(680e-12), 680e-12)})
	if err != nil {
		t.Fatal(err)
	}
	for _, x := range []struct {
		network snubber.Network
		really  float64
		want    string
	}{
		{snubber.Network{Kind: snubber.C, C: 470e-12, CTol: 0.1}, 470e-12 * 1.09, ""},
		{snubber.Network{Kind: snubber.C, C: 470e-12, CTol: 0.1}, 470e-12 * 0.91, ""},
		{snubber.Network{Kind: snubber.C, C: 470e-12, CTol: 0.1}, 560e-12, "which 56"},
		{snubber.Network{Kind: snubber.C, C: 470e-12}, 560e-12, "which 56"}, // of no stated tolerance: as the others
		{measured(470e-12), 470e-12 * 1.09, "which 51"},
		{measured(470e-12), 470e-12 * 1.01, ""},
		{measured(470e-12), 0, "as if there were no capacitor"},
		{snubber.Network{Kind: snubber.Bare}, 0, ""},
		{snubber.Network{Kind: snubber.Bare}, 100e-12, "it rings at"},
		{snubber.Network{Kind: snubber.RC, C: 470e-12, R: 10}, 0, ""}, // of these it does not judge
	} {
		got := doubt(before, nil, trial(x.network, x.really))
		if (got == "") != (x.want == "") || !strings.Contains(got, x.want) {
			t.Errorf("%+v that is %g F: %q, want %q", x.network, x.really, got, x.want)
		}
	}
}

// Sound parts are not asked about.
func TestSeriesWithoutDoubt(t *testing.T) {
	s := sit(t, &made{really: map[string]float64{"A": 104e-12, "B": 211e-12, "C": 490e-12, "D": 0.97e-9}}, slices.Repeat([]string{""}, 9)...)
	s.All = true
	s.Drawer = []Part{{Name: "A", Value: 100e-12, Tol: 0.05}, {Name: "B", Value: 220e-12, Tol: 0.05}, {Name: "C", Value: 470e-12, Tol: 0.05}, {Name: "D", Value: 1e-9, Tol: 0.05}}
	if r, err := s.run(t); err != nil || len(s.logged) != 5 || r.Ended != "every capacitor of the drawer was read or skipped" {
		t.Errorf("%s, %+v, %v", s.networks(), r, err)
	}
	for _, q := range s.asked {
		if q.Kind == InDoubt {
			t.Errorf("asked %q because %s", q.Text, q.Why)
		}
	}
}

func TestSeriesResumes(t *testing.T) {
	first := sit(t, &made{}, "", "", "done")
	if _, err := first.run(t); err != nil {
		t.Fatal(err)
	}
	second := sit(t, &made{}, slices.Repeat([]string{""}, 9)...)
	second.Past, second.All = first.logged, true
	r, err := second.run(t)
	if err != nil || r.Resumed != 2 || second.networks() == "" || strings.Contains(second.networks(), "bare") || strings.Contains(second.networks(), "470") {
		t.Errorf("after %s came %s (%v)", first.networks(), second.networks(), err)
	}
	// Another session begins anew.
	third := sit(t, &made{}, "done")
	third.Past, third.Trial.Session = first.logged, "two"
	if _, err := third.run(t); err != nil || !strings.Contains(third.asked[0].Text, "bare") {
		t.Errorf("%+v, %v", third.asked, err)
	}
}

// Fifty capacitors behind relays, and nobody there.
func TestSeriesUnattended(t *testing.T) {
	b := &made{really: map[string]float64{"C7": 20e-12}}
	s := sit(t, b)
	s.Unattended, s.All = true, true
	for i := range 50 {
		s.Drawer = append(s.Drawer, Part{Name: fmt.Sprintf("C%d", i), Value: float64(60+20*i) * 1e-12, Tol: 0.05, Instrument: "relays", Switch: []string{"A"}, Unswitch: []string{"B"}})
	}
	b.across["C9"] = 240e-12 // left in by somebody
	r, err := s.run(t)
	if err != nil || len(s.asked) > 0 {
		t.Fatalf("%v, asked %d", err, len(s.asked))
	}
	if hz, _ := s.logged[0].Reading(snubber.RingHz); s.logged[0].Network.Kind != snubber.Bare || hz.Value < 100e6 {
		t.Errorf("the bare node rings at %g Hz", hz.Value)
	}
	if len(b.across) > 0 {
		t.Errorf("left across the node: %v", b.across)
	}
	seen := map[string]int{}
	for _, t := range s.logged {
		seen[t.Part]++
	}
	if len(seen) != 51 || len(s.logged) != 51 {
		t.Errorf("%d parts in %d trials", len(seen), len(s.logged))
	}
	remarked := slices.ContainsFunc(s.told, func(e Event) bool { r, ok := e.(Remark); return ok && strings.Contains(r.Text, "disagrees") })
	if r.Fit == nil || !remarked {
		t.Errorf("the fit is %v; C7 was remarked on: %v", r.Fit, remarked)
	}
}

func TestSeriesCannotBegin(t *testing.T) {
	relay := Part{Name: "C1", Value: 1e-9, Instrument: "r", Switch: []string{"A"}, Unswitch: []string{"B"}}
	for want, change := range map[string]func(*Series){
		"no instrument of the rig can":         func(s *Series) { s.Unattended, s.Bench = true, &made{hands: true} },
		"give a drawer":                        func(s *Series) { s.Unattended = true },
		"nobody is there to fit C2":            func(s *Series) { s.Unattended, s.Drawer = true, []Part{relay, {Name: "C2", Value: 1e-9}} },
		"a safe voltage of 0 V":                func(s *Series) { s.SafeV = 0 },
		"0s for the bus to discharge":          func(s *Series) { s.Within = 0 },
		"no instrument of the rig reads bus_v": func(s *Series) { s.Unattended, s.Bench = true, blind{&made{}} },
	} {
		s := sit(t, &made{})
		change(s.Series)
		if _, err := s.Run(t.Context()); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%v, want %q", err, want)
		}
	}
}

// blind is a bench that does not read the bus.
type blind struct{ *made }

func (blind) Provides() []snubber.Quantity { return []snubber.Quantity{snubber.RingHz} }

func TestSeriesWithoutBusReading(t *testing.T) {
	b := &made{}
	s := sit(t, b, "", "", "done")
	s.Bench = blind{b}
	if _, err := s.run(t); err != nil || s.networks() != "bare node" {
		t.Errorf("%s, %v", s.networks(), err)
	}
	if s.asked[0].Kind != MakeSafe || !strings.Contains(s.asked[0].Text, "below 5 V") {
		t.Errorf("asked %+v", s.asked[0])
	}
}

var errBroken = &Fault{Doing: "read ring_hz", Instrument: "scope", Address: "tcp://192.0.2.1", Err: errors.New("it is silent")}

// Whatever goes wrong, the supply is off in the end.
func TestSeriesEndsWithTheSupplyOff(t *testing.T) {
	for name, x := range map[string]struct {
		bench   made
		answers []string
		change  func(*sitting, context.CancelFunc)
		want    string // of the error; "": none
		trials  string
	}{
		"never safe":  {made{stuck: true, v: 48}, []string{""}, nil, "still charged", ""},
		"on fails":    {made{onFails: errBroken}, []string{"", "done"}, nil, "it is silent", ""},
		"take fails":  {made{takeFail: []error{errBroken}}, []string{"", "done"}, nil, "it is silent", ""},
		"tried again": {made{takeFail: []error{errBroken}}, []string{"", "", "done"}, nil, "", "bare node"},
		"off fails":   {made{offFails: errBroken}, []string{""}, nil, "THE SUPPLY MAY BE ON", ""},
		"answers fail": {made{}, []string{""}, func(s *sitting, _ context.CancelFunc) {
			s.Ask = func(context.Context, Question) (string, error) { return "", errBroken }
		}, "silent", ""},
		"log fails": {made{}, []string{""}, func(s *sitting, _ context.CancelFunc) {
			s.Log = func(context.Context, snubber.Trial, []waveform.Record) (string, error) {
				return "", errors.New("disk full")
			}
		}, "disk full", ""},
		"interrupted": {made{}, []string{"", "", ""}, func(s *sitting, cancel context.CancelFunc) {
			s.Take = func(ctx context.Context, t snubber.Trial) (snubber.Trial, []waveform.Record, []string, error) {
				if t.Network.Kind == snubber.C {
					cancel()
					return t, nil, nil, ctx.Err()
				}
				return s.bench.take(ctx, t)
			}
		}, "context canceled", "bare node"},
	} {
		t.Run(name, func(t *testing.T) {
			ctx, cancel := context.WithCancel(t.Context())
			defer cancel()
			s := sit(t, &x.bench, x.answers...)
			if x.change != nil {
				x.change(s, cancel)
			}
			_, err := s.Run(ctx)
			if (err == nil) != (x.want == "") || err != nil && !strings.Contains(err.Error(), x.want) {
				t.Errorf("%v, want %q", err, x.want)
			}
			if s.bench.on && x.bench.offFails == nil {
				t.Error("the supply is left on")
			}
			if last := s.bench.log[len(s.bench.log)-1]; last != "switch false" {
				t.Errorf("the last thing done was %s", last)
			}
			if s.networks() != x.trials {
				t.Errorf("logged %s", s.networks())
			}
		})
	}
}

func TestSeriesPanics(t *testing.T) {
	s := sit(t, &made{}, "")
	s.Take = func(context.Context, snubber.Trial) (snubber.Trial, []waveform.Record, []string, error) {
		panic("a bug")
	}
	func() {
		defer func() { recover() }()
		s.Run(t.Context())
		t.Error("the panic is lost")
	}()
	if s.bench.on {
		t.Error("the supply is left on")
	}
}

// Nobody is asked again and again: a supply that cannot be switched off is not switched on once more.
func TestSeriesUnattendedFaults(t *testing.T) {
	part := Part{Name: "C1", Value: 470e-12, Tol: 0.05, Instrument: "r", Switch: []string{"A"}, Unswitch: []string{"B"}}
	s := sit(t, &made{takeFail: []error{errBroken, nil, errBroken, errBroken}})
	s.Unattended, s.Drawer = true, []Part{part}
	if _, err := s.run(t); err == nil || s.networks() != "bare node" {
		t.Errorf("%s, %v", s.networks(), err)
	}
	ons := 0
	for _, what := range s.bench.log {
		if what == "switch true" {
			ons++
		}
	}
	if ons != 4 {
		t.Errorf("switched on %d times: each trial is begun again once", ons)
	}
}
