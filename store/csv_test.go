package store

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"iter"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"ringbook/snubber"
)

func readAll(trials iter.Seq2[snubber.Trial, error]) (all []snubber.Trial, err error) {
	for t, err := range trials {
		if err != nil {
			return all, err
		}
		all = append(all, t)
	}
	return all, nil
}

func each(all []snubber.Trial) iter.Seq2[snubber.Trial, error] {
	return func(yield func(snubber.Trial, error) bool) {
		for _, t := range all {
			if !yield(t, nil) {
				return
			}
		}
	}
}

func TestReadCSV(t *testing.T) {
	const file = "\ufeffnote, network,c,c_tol,r,revision,board,ring_hz_u,ring_hz,decay_s,at,bus_v,probe_c,peak_v\r\n" +
		"\"two\nlines, \"\"quoted\"\"\",rc,2n2,5%,4R7,B,Kestrel,2k,1.8 MHz,900n,2026-03-01T10:30:00.5+01:00,48V,9.5p,\r\n" +
		"\r\n" +
		",bare,,,,B,Kestrel,,1.9e6,,,,,71.25\r\n" +
		",,,,,,,,,,,,,\r\n"
	got, err := readAll(ReadCSV(strings.NewReader(file)))
	if err != nil {
		t.Fatal(err)
	}
	want := []snubber.Trial{{
		Board: "Kestrel", Revision: "B", At: time.Date(2026, 3, 1, 9, 30, 0, 5e8, time.UTC), Note: "two\nlines, \"quoted\"",
		Network: snubber.Network{Kind: snubber.RC, C: 2.2e-9, CTol: 0.05, R: 4.7},
		Point:   snubber.OperatingPoint{BusV: 48}, ProbeC: 9.5e-12,
		Readings: []snubber.Reading{{Quantity: snubber.RingHz, Value: 1.8e6, U: 2e3}, {Quantity: snubber.DecayS, Value: 900e-9}},
	}, {
		Board: "Kestrel", Revision: "B", Network: snubber.Network{Kind: snubber.Bare},
		Readings: []snubber.Reading{{Quantity: snubber.RingHz, Value: 1.9e6}, {Quantity: snubber.PeakV, Value: 71.25}},
	}}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error("(-want +got):\n" + diff)
	}
}

// named is a reader with a file's name.
type named struct {
	*strings.Reader
	name string
}

func (n named) Name() string { return n.name }

func TestReadCSVSaysWhatIsWrong(t *testing.T) {
	const head = "board,revision,network,c,c_tol,r,ring_hz,ring_hz_u,peak_v,at,note\n"
	for _, c := range []struct {
		name, file string
		says       []string
	}{
		{"nothing", "", []string{"trials.csv is empty", "board, revision, network"}},
		{"unknown column", "board,revision,network,ring_mhz,mood\nA,1,bare,2,3\n", []string{`line 1: column 4 "ring_mhz"`, "did you mean ring_hz?", `column 5 "mood"`}},
		{"missing columns", "board,c\n", []string{"column revision is missing", "column network is missing"}},
		{"column twice", "board,revision,network,c,c\n", []string{`column 5 "c" is there twice (column 4 too)`}},
		{"semicolons", "board;revision;network\nA;1;bare\n", []string{"semicolons", "commas"}},
		{"tabs", "board\trevision\tnetwork\n", []string{"tabs"}},
		{"UTF-16", "\xff\xfeb\x00o\x00", []string{"UTF-16", "UTF-8"}},
		{"a bad number", head + "A,1,bare,,,,,,,,\nA,1,c,1n,,,1M,,,,\nA,1,bare,,,,1.8 furlongs,,,,\n", []string{`trials.csv line 4, column 7 (ring_hz): `, `"1.8 furlongs"`, "MHz"}},
		{"two bad cells in a row", head + "A,1,bare,,,,fast,,high,,\n", []string{`line 2, column 7 (ring_hz)`, `"fast"`, `line 2, column 9 (peak_v)`, `"high"`}},
		{"a line after a text of several lines", head + "A,1,bare,,,,,,,,\"x\ny\"\nA,1,rx,,,,,,,,\n", []string{`line 4, column 3 (network): network "rx"`}},
		{"uncertainty of nothing", head + "A,1,bare,,,,,2k,,,\n", []string{`line 2, column 8 (ring_hz_u): "2k": ring_hz is empty`}},
		{"no board", head + ",1,bare,,,,,,,,\n", []string{`line 2, column 1 (board): "": it is empty`}},
		{"no network", head + "A,1,,,,,,,,,\n", []string{`line 2, column 3 (network): network ""`}},
		{"rc without r", head + "A,1,rc,1n,,,,,,,\n", []string{`line 2, column 3 (network)`, "needs a positive resistance"}},
		{"bare with c", head + "A,1,bare,1n,,,,,,,\n", []string{"it has no capacitor"}},
		{"a tolerance beyond 1", head + "A,1,c,1n,120%,,,,,,\n", []string{"c_tol"}},
		{"ring of zero", head + "A,1,bare,,,,0,,,,\n", []string{`(ring_hz): "0": `, "above zero"}},
		{"infinite", head + "A,1,bare,,,,Inf,,,,\n", []string{`(ring_hz)`, `"Inf"`}},
		{"not a number", head + "A,1,bare,,,,,,NaN,,\n", []string{`(peak_v)`, `"NaN"`}},
		{"a spreadsheet's time", head + "A,1,bare,,,,,,,1/3/2026 10:00,\n", []string{`column 10 (at): "1/3/2026 10:00"`, "RFC 3339"}},
		{"cells missing", head + "A,1,bare\n", []string{"line 2: 3 cells where the header row has 11"}},
		{"cells too many", head + "A,1,bare,,,,,,,,,,\n", []string{"line 2: 13 cells where the header row has 11"}},
		{"stray quotation mark", head + "A,1,bare,,,,,,,,5\" cable\n", []string{"line 2, character", "twice"}},
		{"NUL", head + "A\x00,1,bare,,,,,,,,\n", []string{`(board): "A\x00" has a control character (U+0000)`}},
		{"terminal escape", head + "A,1,bare,,,,,,,,\x1b[2J\n", []string{"(note)", "U+001B"}},
		{"not UTF-8", head + "A\xe9,1,bare,,,,,,,,\n", []string{"(board)", "UTF-8"}},
		{"a long name", head + strings.Repeat("A", 300) + ",1,bare,,,,,,,,\n", []string{"300 bytes"}},
		{"a mark left open", head + "A,1,bare,,,,,,,,\"" + strings.Repeat("x\n", maxRow), []string{"more than 4194304 bytes", "quotation mark"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := readAll(ReadCSV(named{strings.NewReader(c.file), "some/folder/trials.csv"}))
			if err == nil {
				t.Fatal("no error")
			}
			for _, want := range append(c.says, "trials.csv ") {
				if !strings.Contains(err.Error(), want) {
					t.Errorf("error %q lacks %q", err, want)
				}
			}
			if strings.Contains(err.Error(), "folder") || len(err.Error()) > 3000 {
				t.Errorf("error %q", err)
			}
		})
	}
}

func TestBadRowsLogNothing(t *testing.T) {
	lb := openTemp(t)
	var file strings.Builder
	file.WriteString("board,revision,network,peak_v\n")
	for i := range 100 {
		v := fmt.Sprint(i)
		if i >= 50 && i < 75 {
			v = "high" + v
		}
		fmt.Fprintf(&file, "A,1,bare,%s\n", v)
	}
	n, err := lb.AddAll(t.Context(), ReadCSV(strings.NewReader(file.String())), nil)
	var bad *BadRows
	if n != 0 || !errors.As(err, &bad) || bad.Rows != 25 || len(bad.Cells) != 20 {
		t.Fatalf("%d, %v", n, err)
	}
	if s := err.Error(); !strings.Contains(s, "line 52, column 4") || !strings.HasSuffix(s, "and 5 more rows") {
		t.Errorf("error %q", s)
	}
	if n := len(collect(t, lb, Scope{})); n != 0 {
		t.Errorf("%d trials logged", n)
	}
	if boards, err := lb.Boards(t.Context()); err != nil || len(boards) != 0 {
		t.Errorf("boards %v, %v", boards, err)
	}
	// The writer must have forgotten the board that was rolled back with them.
	mustAdd(t, lb, snubber.Trial{Board: "A", Revision: "1", Network: snubber.Network{Kind: snubber.Bare}})
}

// drawTrial is any trial that CSV can carry.
func drawTrial(rt *rapid.T) snubber.Trial {
	name := rapid.StringMatching(`[A-Za-z0-9ßé=+@;,"'<&-]([A-Za-z0-9 ß,"=-]{0,8}[A-Z"])?`)
	words := rapid.StringOf(rapid.RuneFrom([]rune("ab, \"\n\t;=ßµ'#\\.")))
	positive := rapid.Float64Range(1e-300, 1e300)
	maybe := func(g *rapid.Generator[float64]) float64 {
		return rapid.OneOf(rapid.Just(0.0), g).Draw(rt, "v")
	}
	t := snubber.Trial{
		Board: name.Draw(rt, "board"), Revision: name.Draw(rt, "revision"), Session: rapid.OneOf(rapid.Just(""), name).Draw(rt, "session"),
		Part: words.Draw(rt, "part"), Note: words.Draw(rt, "note"), ProbeC: maybe(positive),
		Point: snubber.OperatingPoint{BusV: maybe(rapid.Float64Range(-1e9, 1e9)), CurrentA: maybe(rapid.Float64Range(-1e9, 1e9)), SwitchingHz: maybe(positive)},
	}
	if s := words.Draw(rt, "struck"); strings.TrimSpace(s) != "" {
		t.Struck = s
	}
	if rapid.Bool().Draw(rt, "dated") {
		t.At = time.Unix(rapid.Int64Range(-2e9, 2e11).Draw(rt, "s"), rapid.Int64Range(0, 999999999).Draw(rt, "ns")).UTC()
	}
	tol := rapid.Float64Range(0, 0.999)
	n := &t.Network
	n.Kind = rapid.SampledFrom([]snubber.Kind{snubber.Bare, snubber.C, snubber.RC, snubber.RCD}).Draw(rt, "network")
	if n.Kind.HasC() {
		n.C, n.CTol, n.ESR, n.MeasuredC = positive.Draw(rt, "c"), tol.Draw(rt, "c_tol"), maybe(positive), maybe(positive)
		if n.MeasuredC > 0 {
			n.MeasuredU = maybe(positive)
		}
	}
	if n.Kind.HasR() {
		n.R, n.RTol = positive.Draw(rt, "r"), tol.Draw(rt, "r_tol")
	}
	for _, q := range []snubber.Quantity{snubber.RingHz, snubber.DecayS, snubber.PeakV, snubber.SupplyA, snubber.TempC} {
		if rapid.Bool().Draw(rt, string(q)) {
			t.Readings = append(t.Readings, snubber.Reading{Quantity: q, Value: positive.Draw(rt, "value"), U: maybe(positive)})
		}
	}
	return t
}

func TestCSVRoundTrip(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		want := rapid.SliceOfN(rapid.Custom(drawTrial), 1, 4).Draw(rt, "trials")
		var file bytes.Buffer
		if n, err := WriteCSV(&file, each(want)); n != len(want) || err != nil {
			rt.Fatal(n, err)
		}
		first := file.String()
		got, err := readAll(ReadCSV(strings.NewReader(first)))
		if err != nil {
			rt.Fatalf("%v in\n%s", err, first)
		}
		if diff := cmp.Diff(want, got); diff != "" {
			rt.Fatalf("(-want +got):\n%s\n%s", diff, first)
		}
		file.Reset()
		if _, err := WriteCSV(&file, each(got)); err != nil || file.String() != first {
			rt.Fatalf("written again (%v):\n%s\nwas:\n%s", err, file.String(), first)
		}
	})
}

// TestLogbookRoundTrip puts the same trials through the file.
func TestLogbookRoundTrip(t *testing.T) {
	lb := openTemp(t)
	rapid.Check(t, func(rt *rapid.T) {
		want := drawTrial(rt)
		repeats := rapid.SliceOfN(rapid.Float64Range(-1e300, 1e300), 1, 5)
		for i := range want.Readings {
			if rapid.Bool().Draw(rt, "repeated") {
				want.Readings[i].Repeats = repeats.Draw(rt, "repeats")
				want.Readings[i].Instrument = "Larkspur Works,Scope 4,0007,1.2"
			}
		}
		if want.At.IsZero() {
			want.At = time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC)
		}
		var err error
		if want.ID, err = lb.Add(context.Background(), want); err != nil {
			rt.Fatal(err)
		}
		got, err := lb.Trial(context.Background(), want.ID)
		if err != nil {
			rt.Fatal(err)
		}
		if diff := cmp.Diff(want, got); diff != "" {
			rt.Fatal("(-want +got):\n" + diff)
		}
	})
}

func FuzzReadCSV(f *testing.F) {
	f.Add("board,revision,network,c,c_tol,r,ring_hz,ring_hz_u,at\nA,1,rc,2n2,5%,4R7,1.8 MHz,2k,2026-03-01T10:30:00+01:00\n")
	f.Add("\ufeffnote,network,revision,board\r\n\"a\nb\",bare,1,\"A \"\"x\"\"\"\r\n")
	f.Add("board;revision;network\n")
	f.Add("board,revision,network,temp_c,temp_c_u,peak_v,struck,session\nA,1,bare,-4,1,1e-320,wrong,monday\n,,,,,,,\n")
	f.Add("board,revision,network,note\nA,1,bare,\"open")
	f.Fuzz(func(t *testing.T, file string) {
		got, err := readAll(ReadCSV(strings.NewReader(file)))
		if err != nil {
			if err.Error() == "" {
				t.Fatal("an error without words")
			}
			return
		}
		var out bytes.Buffer
		if _, err := WriteCSV(&out, each(got)); err != nil {
			t.Fatal(err)
		}
		again, err := readAll(ReadCSV(&out))
		if err != nil {
			t.Fatalf("what was read from %q does not read back: %v", file, err)
		}
		if diff := cmp.Diff(got, again); diff != "" {
			t.Fatalf("(-first +second):\n%s", diff)
		}
	})
}
