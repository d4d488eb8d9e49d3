package store

import (
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"ringbook/snubber"
)

func TestBoards(t *testing.T) {
	lb := openTemp(t)
	id := mustAdd(t, lb, example())
	for _, b := range []Board{
		{Name: "Plover", DeviceV: 100, Note: "spare", Revisions: []Revision{{Name: "1", Note: "first"}, {Name: "2"}}},
		{Name: "Kestrel", DeviceV: 80},
		{Name: "Kestrel"},
		{Name: "Kestrel", DeviceV: 80, Revisions: []Revision{{Name: "B"}, {Name: "C", Note: "shorter loop"}}},
	} {
		if err := lb.AddBoard(t.Context(), b); err != nil {
			t.Fatal(err)
		}
	}
	err := lb.AddBoard(t.Context(), Board{Name: "Kestrel", DeviceV: 60, Revisions: []Revision{{Name: "D"}}})
	if err == nil || !strings.Contains(err.Error(), "80 V, not 60 V") {
		t.Errorf("another rating: %v", err)
	}
	if err := lb.AddBoard(t.Context(), Board{Name: "Plover", Note: "lost"}); err == nil || !strings.Contains(err.Error(), `"spare", not "lost"`) {
		t.Errorf("another note: %v", err)
	}
	if err := lb.AddBoard(t.Context(), Board{Name: "Plover", Revisions: []Revision{{Name: "1", Note: "last"}}}); err == nil || !strings.Contains(err.Error(), `"first", not "last"`) {
		t.Errorf("another note of a revision: %v", err)
	}
	if err := lb.CorrectBoard(t.Context(), Board{Name: "Plover", DeviceV: 120}); err != nil {
		t.Fatal(err)
	}
	if err := lb.EnsureRevision(t.Context(), "Wren", "A"); err != nil {
		t.Fatal(err)
	}
	if err := lb.AddBoard(t.Context(), Board{Name: "Avocet"}); err != nil {
		t.Fatal(err)
	}
	at := example().At
	want := []Board{
		{Name: "Avocet"},
		{Name: "Kestrel", DeviceV: 80, Revisions: []Revision{
			{Board: "Kestrel", Name: "B", DeviceV: 80, Trials: 1, First: at, Last: at},
			{Board: "Kestrel", Name: "C", DeviceV: 80, Note: "shorter loop"},
		}},
		{Name: "Plover", DeviceV: 120, Note: "spare", Revisions: []Revision{
			{Board: "Plover", Name: "1", DeviceV: 120, Note: "first"}, {Board: "Plover", Name: "2", DeviceV: 120}}},
		{Name: "Wren", Revisions: []Revision{{Board: "Wren", Name: "A"}}},
	}
	got, err := lb.Boards(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error("(-want +got):\n" + diff)
	}
	if err := lb.Strike(t.Context(), id, "wrong board"); err != nil {
		t.Fatal(err)
	}
	if got, err = lb.Boards(t.Context()); err != nil || got[1].Revisions[0].Trials != 0 {
		t.Errorf("a struck trial is counted: %v, %v", got[1].Revisions[0], err)
	}
}

func TestBoardsThatCannotBe(t *testing.T) {
	lb := openTemp(t)
	for _, b := range []Board{
		{}, {Name: "a\nb"}, {Name: "a", DeviceV: -1}, {Name: "a", DeviceV: math.NaN()}, {Name: "a", DeviceV: math.Inf(1)},
		{Name: strings.Repeat("a", 201)}, {Name: "a", Revisions: []Revision{{}}}, {Name: "a", Note: "\x00"},
	} {
		if err := lb.AddBoard(t.Context(), b); err == nil {
			t.Errorf("accepted %+v", b)
		}
	}
}

func TestAddRefusesWhatNoTrialCanBe(t *testing.T) {
	lb := openTemp(t)
	for name, spoil := range map[string]func(*snubber.Trial){
		"board: ":                func(t *snubber.Trial) { t.Board = "" },
		"revision: ":             func(t *snubber.Trial) { t.Revision = "a\tb" },
		"session: ":              func(t *snubber.Trial) { t.Session = " a" },
		"note: ":                 func(t *snubber.Trial) { t.Note = strings.Repeat("x", 1_000_001) },
		"part: ":                 func(t *snubber.Trial) { t.Part = "a\x00b" },
		"struck: ":               func(t *snubber.Trial) { t.Struck = "  " },
		"at: ":                   func(t *snubber.Trial) { t.At = t.At.AddDate(-200, 0, 0) },
		"network: ":              func(t *snubber.Trial) { t.Network.C = math.NaN() },
		"r_tol: ":                func(t *snubber.Trial) { t.Network.Kind, t.Network.R = snubber.C, 0 },
		"measured_c: ":           func(t *snubber.Trial) { t.Network.MeasuredC = -1 },
		"measured_c_u: ":         func(t *snubber.Trial) { t.Network.MeasuredC = 0 },
		"probe_c: ":              func(t *snubber.Trial) { t.ProbeC = -1e-12 },
		"bus_v: ":                func(t *snubber.Trial) { t.Point.BusV = math.NaN() },
		"switching_hz: ":         func(t *snubber.Trial) { t.Point.SwitchingHz = -1 },
		"ring_hz: ":              func(t *snubber.Trial) { t.Readings[0].Value = 0 },
		"ring_hz: repeat 2 is":   func(t *snubber.Trial) { t.Readings[0].Repeats[1] = math.NaN() },
		"decay_s_u: ":            func(t *snubber.Trial) { t.Readings[1].U = -1 },
		"peak_v: -Inf":           func(t *snubber.Trial) { t.Readings[2].Value = math.Inf(-1) },
		"ring_hz: it is read tw": func(t *snubber.Trial) { t.Readings = append(t.Readings, t.Readings[0]) },
		"quantity: \"ring_mhz\"": func(t *snubber.Trial) { t.Readings[0].Quantity = "ring_mhz" },
		"instrument: ":           func(t *snubber.Trial) { t.Readings[0].Instrument = "a\r\nb" },
		"it has the id":          func(t *snubber.Trial) { t.ID = "01900000-0000-7000-8000-00000012cafe" },
	} {
		trial := example()
		spoil(&trial)
		_, err := lb.Add(t.Context(), trial)
		if err == nil || !strings.Contains(err.Error(), "log the trial: "+name) || len(err.Error()) > 400 {
			t.Errorf("want %q; error %v", name, err)
		}
		if n, err := lb.AddAll(t.Context(), each([]snubber.Trial{example(), trial}), nil); n != 0 || err == nil || !strings.Contains(err.Error(), "trial 2") {
			t.Errorf("AddAll: %d, %v", n, err)
		}
	}
	if n := len(collect(t, lb, Scope{IncludeStruck: true})); n != 0 {
		t.Errorf("%d trials logged", n)
	}
}
