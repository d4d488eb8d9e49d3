package store

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"math"
	"os"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"ringbook/snubber"
)

// decided is a decision that rests on trials.
func decided(trials ...snubber.Trial) Decision {
	d := Decision{
		Board: "Kestrel", Revision: "B", At: time.Date(2026, 3, 1, 10, 0, 0, 5, time.UTC),
		Network: snubber.Network{Kind: snubber.RC, C: 270e-12, CTol: 0.05, R: 9.1, RTol: 0.01},
		LimitV:  80, Peak: snubber.Estimate{Value: 74.5, U: 0.5, Low: 73.25, High: 75.75}, Damping: 0.21, LossW: 0.43,
		Excitation: snubber.Excitation{Bus: 48, Current: 4.6}, SwitchingHz: 400e3,
		Loop:   snubber.Loop{Inductance: 13e-9, Capacitance: 240e-12, Resistance: 0.7},
		Digest: TrialsDigest(trials), Recommendation: json.RawMessage(`{"met": true}`),
	}
	for _, t := range trials {
		d.Trials = append(d.Trials, t.ID)
	}
	return d
}

// logged adds n trials like example, a minute apart, and gives them as the logbook has them.
func logged(t testing.TB, lb *Logbook, n int) []snubber.Trial {
	t.Helper()
	for i := range n {
		trial := example()
		trial.At = trial.At.Add(time.Duration(i) * time.Minute)
		mustAdd(t, lb, trial)
	}
	return collect(t, lb, Scope{})
}

func mustDecide(t testing.TB, lb *Logbook, d Decision) string {
	t.Helper()
	id, err := lb.AddDecision(t.Context(), d)
	if err != nil {
		t.Fatal(err)
	}
	return id
}

func decisions(t testing.TB, lb *Logbook, s Scope) []Decision {
	t.Helper()
	var all []Decision
	for d, err := range lb.Decisions(t.Context(), s) {
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, d)
	}
	return all
}

func TestDecideThenRead(t *testing.T) {
	lb := openTemp(t)
	trials := logged(t, lb, 3)
	full := decided(trials...)
	full.ID = mustDecide(t, lb, full)
	least := decided(trials[1]) // all that may be left out
	least.At = full.At.Add(-time.Hour)
	least.Network = snubber.Network{Kind: snubber.C, C: 1e-9}
	least.Peak.U, least.Peak.Low, least.Peak.High = 0, least.Peak.Value, least.Peak.Value
	least.Damping, least.LossW, least.Excitation.Current, least.SwitchingHz, least.Loop.Resistance, least.Recommendation = 0, 0, 0, 0, 0, nil
	least.ID = mustDecide(t, lb, least)
	undated := decided(trials...)
	undated.At = time.Time{}
	before := time.Now()
	undated.ID = mustDecide(t, lb, undated)

	all := decisions(t, lb, Scope{})
	if len(all) != 3 || all[2].At.Before(before) || all[2].At.After(time.Now()) {
		t.Fatalf("%d decisions, the last at %v; want 3, the undated one now", len(all), all[len(all)-1].At)
	}
	undated.At = all[2].At
	if diff := cmp.Diff([]Decision{least, full, undated}, all); diff != "" {
		t.Error("as logged, in the order made (-want +got):\n" + diff)
	}
	for _, id := range []string{full.ID, ShortID(full.ID), strings.ToUpper(full.ID)} {
		got, err := lb.Decision(t.Context(), id)
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(full, got); diff != "" {
			t.Errorf("decision %s (-want +got):\n%s", id, diff)
		}
	}
	for _, id := range []string{"abc", trials[0].ID, "'; DROP TABLE decision; --"} {
		if _, err := lb.Decision(t.Context(), id); !errors.Is(err, ErrNoDecision) || !strings.Contains(err.Error(), quote(id)) {
			t.Errorf("decision %s: %v", id, err)
		}
	}
	if err := lb.Strike(t.Context(), trials[0].ID, "probe fell off"); err != nil {
		t.Fatal(err)
	}
	var behind []string
	for trial, err := range lb.DecisionTrials(t.Context(), full.ID) {
		if err != nil {
			t.Fatal(err)
		}
		behind = append(behind, trial.ID+trial.Struck)
	}
	if want := []string{trials[0].ID + "probe fell off", trials[1].ID, trials[2].ID}; !slices.Equal(behind, want) {
		t.Errorf("trials behind it %q, want %q", behind, want)
	}
}

func TestDecisionsInScope(t *testing.T) {
	lb := openTemp(t)
	first := logged(t, lb, 1)[0]
	other := example()
	other.Revision = "C"
	other.ID = mustAdd(t, lb, other)
	for i := range 3 {
		d := decided(first)
		d.At, d.LimitV = d.At.Add(time.Duration(i)*time.Hour), float64(80+i)
		mustDecide(t, lb, d)
	}
	d := decided(other)
	d.Revision, d.LimitV = "C", 90
	mustDecide(t, lb, d)
	at := d.At
	for _, c := range []struct {
		name  string
		scope Scope
		want  []float64
	}{
		{"all", Scope{}, []float64{80, 90, 81, 82}},
		{"a revision", Scope{Board: "Kestrel", Revision: "B"}, []float64{80, 81, 82}},
		{"the latest of it", Scope{Board: "Kestrel", Revision: "B", Limit: 1}, []float64{82}},
		{"the latest two, oldest first", Scope{Board: "Kestrel", Limit: 2}, []float64{81, 82}},
		{"since is inclusive, until is not", Scope{Since: at.Add(time.Hour), Until: at.Add(2 * time.Hour)}, []float64{81}},
		{"an unknown board", Scope{Board: "Merlin"}, nil},
	} {
		var got []float64
		for _, d := range decisions(t, lb, c.scope) {
			got = append(got, d.LimitV)
		}
		if !slices.Equal(got, c.want) {
			t.Errorf("%s: limits %v, want %v", c.name, got, c.want)
		}
	}
}

func TestWhatIsNoDecision(t *testing.T) {
	lb := openTemp(t)
	trials := logged(t, lb, 1)
	elsewhere := example()
	elsewhere.Revision = "C"
	elsewhere.ID = mustAdd(t, lb, elsewhere)
	for says, spoil := range map[string]func(*Decision){
		"leave the id empty":           func(d *Decision) { d.ID = trials[0].ID },
		"name the board":               func(d *Decision) { d.Board = "" },
		"revision: \"\\x1b\"":          func(d *Decision) { d.Revision = "\x1b" },
		"the year 1":                   func(d *Decision) { d.At = time.Date(1, 2, 1, 0, 0, 0, 0, time.UTC) },
		"recommends c, rc or rcd":      func(d *Decision) { d.Network = snubber.Network{Kind: snubber.Bare} },
		"positive resistance":          func(d *Decision) { d.Network.R = 0 },
		"loop inductance 0 H":          func(d *Decision) { d.Loop.Inductance = 0 },
		"limit_v: 0":                   func(d *Decision) { d.LimitV = 0 },
		"peak_v: NaN":                  func(d *Decision) { d.Peak.Value = math.NaN() },
		"peak_v_u: -1":                 func(d *Decision) { d.Peak.U = -1 },
		"from 76 to 75.75":             func(d *Decision) { d.Peak.Low = 76 },
		"from 73.25 to +Inf":           func(d *Decision) { d.Peak.High = math.Inf(1) },
		"damping_ratio: +Inf":          func(d *Decision) { d.Damping = math.Inf(1) },
		"bus_v: 0":                     func(d *Decision) { d.Excitation.Bus = 0 },
		"excitation_a: -1":             func(d *Decision) { d.Excitation.Current = -1 },
		"make it with TrialsDigest":    func(d *Decision) { d.Digest = strings.ToUpper(d.Digest) },
		`digest: "abc"`:                func(d *Decision) { d.Digest = "abc" },
		"rests on trials":              func(d *Decision) { d.Trials = nil },
		"is there twice":               func(d *Decision) { d.Trials = append(d.Trials, d.Trials...) },
		"no such trial of board":       func(d *Decision) { d.Trials = append(d.Trials, elsewhere.ID) },
		"name trials by their whole":   func(d *Decision) { d.Trials = []string{ShortID(trials[0].ID)} },
		`recommendation: "{" is not`:   func(d *Decision) { d.Recommendation = json.RawMessage("{") },
		"tolerance is a fraction from": func(d *Decision) { d.Network.CTol = 1 },
	} {
		d := decided(trials...)
		spoil(&d)
		if _, err := lb.AddDecision(t.Context(), d); err == nil || !strings.Contains(err.Error(), says) || !strings.HasPrefix(err.Error(), "log the decision: ") {
			t.Errorf("error %v; want %q", err, says)
		}
	}
	if all := decisions(t, lb, Scope{}); len(all) != 0 {
		t.Errorf("%d decisions were logged", len(all))
	}
	d := decided(trials...)
	d.Revision = "new" // a decision that fails makes no revision either
	if _, err := lb.AddDecision(t.Context(), d); !errors.Is(err, ErrNoTrial) {
		t.Errorf("a revision without trials: %v", err)
	}
	boards, err := lb.Boards(t.Context())
	if err != nil || len(boards) != 1 || len(boards[0].Revisions) != 2 {
		t.Errorf("boards %v, %v", boards, err)
	}
}

// TestDecisionsStay tries to change them as another program would, with SQLite's own defaults.
func TestDecisionsStay(t *testing.T) {
	lb := openTemp(t)
	trials := logged(t, lb, 2)
	mustDecide(t, lb, decided(trials...))
	before := decisions(t, lb, Scope{})
	for table, column := range map[string]string{"decision": "peak_v_high", "decision_trial": "trial"} {
		for script, says := range map[string]string{
			"UPDATE " + table + " SET " + column + " = 99":                "is never changed",
			"DELETE FROM " + table:                                        "is never deleted",
			"INSERT OR REPLACE INTO " + table + " SELECT * FROM " + table: "is never replaced",
		} {
			if err := execOn(t, lb.Path(), script); err == nil || !strings.Contains(err.Error(), says) {
				t.Errorf("%s: error %v; want %q", script, err, says)
			}
		}
	}
	if diff := cmp.Diff(before, decisions(t, lb, Scope{})); diff != "" {
		t.Error("(-before +after):\n" + diff)
	}
	// What no program may log.
	for set, value := range map[string]string{
		"":        "", // as it is
		"limit_v": "0", "peak_v": "9e999", "peak_v_low": "-9e999", "peak_v_high": "1", "network": "'bare'", "r": "NULL", "c": "-1",
		"digest": "upper(digest)", "recommendation": "'{'", "at": "'2026-03-01'", "inductance_h": "NULL", "excitation_a": "-1", "revision": "99",
	} {
		columns := "revision, at, network, c, r, limit_v, peak_v, peak_v_low, peak_v_high, bus_v, excitation_a, inductance_h, capacitance_f, digest, recommendation"
		values := ", " + columns + ","
		values = strings.Replace(values, ", "+set+",", ", "+value+",", 1)
		script := "INSERT INTO decision (id, " + columns + ") SELECT substr(id, 2) || 'x'" + strings.TrimSuffix(values, ",") + " FROM decision"
		if _, err := lb.db.ExecContext(t.Context(), script); (err == nil) != (set == "") {
			t.Errorf("%s: %v", script, err)
		}
		if set == "" {
			before = decisions(t, lb, Scope{})
		}
	}
	if n := len(decisions(t, lb, Scope{})); n != len(before) || n != 2 {
		t.Errorf("%d decisions, want 2", n)
	}
}

// TestDecisionTable compares the view with its documentation and with what Decisions gives.
func TestDecisionTable(t *testing.T) {
	lb := openTemp(t)
	trials := logged(t, lb, 2)
	want := decided(trials...)
	want.ID = mustDecide(t, lb, want)
	if err := lb.Strike(t.Context(), trials[0].ID, "probe fell off"); err != nil {
		t.Fatal(err)
	}
	rows, err := lb.db.QueryContext(t.Context(), "SELECT * FROM decision_table")
	if err != nil {
		t.Fatal(err)
	}
	defer rows.Close()
	names, err := rows.Columns()
	if err != nil {
		t.Fatal(err)
	}
	const contract = "id board revision network c c_tol r r_tol limit_v peak_v peak_v_u peak_v_low peak_v_high damping_ratio loss_w " +
		"bus_v excitation_a switching_hz inductance_h capacitance_f resistance_ohm at trials struck digest"
	if got := strings.Join(names, " "); got != contract {
		t.Fatalf("columns\n%s\nwant\n%s", got, contract)
	}
	doc, err := os.ReadFile("doc.go")
	if err != nil {
		t.Fatal(err)
	}
	_, section, _ := strings.Cut(string(doc), "# The view decision_table")
	for _, name := range names {
		if !strings.Contains(section, "\n//\t"+name+" ") {
			t.Errorf("doc.go does not describe column %s", name)
		}
	}
	cells, into := make([]any, len(names)), make([]any, len(names))
	for i := range cells {
		into[i] = &cells[i]
	}
	if !rows.Next() {
		t.Fatal("no row")
	}
	if err := rows.Scan(into...); err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff([]any{want.ID, "Kestrel", "B", "rc", 270e-12, 0.05, 9.1, 0.01, 80.0, 74.5, 0.5, 73.25, 75.75, 0.21, 0.43,
		48.0, 4.6, 400e3, 13e-9, 240e-12, 0.7, timeText(want.At), int64(2), int64(1), want.Digest}, cells); diff != "" {
		t.Error("(-want +got):\n" + diff)
	}
}

// canonicalExample is example's text by the rules TrialsDigest states, written by hand.
const canonicalExample = `ringbook trials 1
trial 01900000-0000-7000-8000-000000000001
board Kestrel
revision B
at 2026-03-01T09:00:00.000000000Z
network bare
reading peak_v -0.5
trial 01900000-0000-7000-8000-000000000002
board Kestrel
revision B
session morning
at 2026-03-01T09:30:00.123456789Z
network rc
c 4.7e-10
c_tol 0.05
r 10
r_tol 0.01
esr 0.2
measured_c 4.68e-10
measured_c_u 1e-12
probe_c 9.5e-12
bus_v 48
current_a 6.5
switching_hz 250000
part drawer 3, blue
note first\n	try "quoted", größer
reading decay_s 9e-07
u 1e-08
reading peak_v 71.25
reading ring_hz 1.8e+06
u 2000
instrument Larkspur Works,Scope 4,0007,1.2
repeat 1.801e+06
repeat 1.799e+06
repeat 1.8e+06
reading supply_a 1.25
instrument Larkspur Works,Supply 2,0011,3.0
reading temp_c -4
`

func TestTrialsDigest(t *testing.T) {
	full := example()
	full.ID = "01900000-0000-7000-8000-000000000002"
	bare := snubber.Trial{ID: "01900000-0000-7000-8000-000000000001", Board: "Kestrel", Revision: "B", At: time.Date(2026, 3, 1, 9, 0, 0, 0, time.UTC),
		Network: snubber.Network{Kind: snubber.Bare}, Readings: []snubber.Reading{{Quantity: snubber.PeakV, Value: -0.5}}}
	sum := sha256.Sum256([]byte(canonicalExample))
	want := hex.EncodeToString(sum[:])
	got := TrialsDigest([]snubber.Trial{full, bare})
	if got != want {
		t.Errorf("digest %s, want %s of the text\n%s", got, want, appendTrial(appendTrial(nil, &bare), &full))
	}
	// The digests of logbooks that exist: of this text, by another program (Python's hashlib).
	if byPython := "2e3f53a1e70c8ae4df78b50f142643ccaeeaa77e15cc29ee09ca40f431629476"; want != byPython {
		t.Errorf("the text's own digest is %s, want %s", want, byPython)
	}
	if again := TrialsDigest([]snubber.Trial{bare, full}); again != got {
		t.Error("the order of the trials shows")
	}
	turned := example()
	turned.ID, turned.Struck = full.ID, "probe fell off"
	turned.At = turned.At.In(time.FixedZone("east", 3600))
	slices.Reverse(turned.Readings)
	if again := TrialsDigest([]snubber.Trial{turned, bare}); again != got {
		t.Error("the order of the readings, the zone of the time or the strike shows")
	}
	for name, change := range map[string]func(*snubber.Trial){
		"id": func(x *snubber.Trial) { x.ID = strings.Replace(x.ID, "2", "3", 1) }, "board": func(x *snubber.Trial) { x.Board = "K" },
		"revision": func(x *snubber.Trial) { x.Revision = "C" }, "at": func(x *snubber.Trial) { x.At = x.At.Add(1) },
		"session": func(x *snubber.Trial) { x.Session = "" }, "network": func(x *snubber.Trial) { x.Network.Kind = snubber.RCD },
		"c": func(x *snubber.Trial) { x.Network.C *= 1 + 1e-15 }, "c_tol": func(x *snubber.Trial) { x.Network.CTol = 0 },
		"r": func(x *snubber.Trial) { x.Network.R = 11 }, "r_tol": func(x *snubber.Trial) { x.Network.RTol = 0.02 },
		"esr": func(x *snubber.Trial) { x.Network.ESR = 0 }, "measured_c": func(x *snubber.Trial) { x.Network.MeasuredC = 0 },
		"measured_c_u": func(x *snubber.Trial) { x.Network.MeasuredU = 0 }, "probe_c": func(x *snubber.Trial) { x.ProbeC = 0 },
		"bus_v": func(x *snubber.Trial) { x.Point.BusV = -48 }, "current_a": func(x *snubber.Trial) { x.Point.CurrentA = 0 },
		"switching_hz": func(x *snubber.Trial) { x.Point.SwitchingHz = 1 }, "part": func(x *snubber.Trial) { x.Part = "" },
		"note": func(x *snubber.Trial) { x.Note = strings.Replace(x.Note, "\n", `\n`, 1) }, "value": func(x *snubber.Trial) { x.Readings[2].Value = 71.3 },
		"u": func(x *snubber.Trial) { x.Readings[0].U = 0 }, "repeat": func(x *snubber.Trial) { x.Readings[0].Repeats[1] = 1 },
		"instrument": func(x *snubber.Trial) { x.Readings[3].Instrument = "" }, "quantity": func(x *snubber.Trial) { x.Readings[4].Quantity = snubber.CurrentA },
	} {
		x := example()
		x.ID = full.ID
		change(&x)
		if TrialsDigest([]snubber.Trial{x, bare}) == got {
			t.Errorf("another %s leaves the digest as it was", name)
		}
	}
}

// A digest made of what a person typed is that of what the logbook gives back, on whatever day.
func TestDigestSurvivesTheFile(t *testing.T) {
	lb := openTemp(t)
	trial := example()
	trial.Readings[4].Value = math.Copysign(0, -1)
	trial.ID = mustAdd(t, lb, trial)
	if got, want := TrialsDigest(collect(t, lb, Scope{})), TrialsDigest([]snubber.Trial{trial}); got != want {
		t.Errorf("digest %s, want %s", got, want)
	}
}
