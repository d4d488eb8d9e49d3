package store

import (
	"errors"
	"fmt"
	"io"
	"iter"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

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
	if zone := got[0].At.Location(); zone != time.UTC {
		t.Errorf("at is in %v, want UTC", zone)
	}
}

// broken is a file on a disk that fails.
type broken struct{ after io.Reader }

func (b broken) Read(p []byte) (int, error) {
	if n, err := b.after.Read(p); n > 0 || err != io.EOF {
		return n, err
	}
	return 0, errors.New("the disk went away")
}

func TestReadCSVFromABrokenDisk(t *testing.T) {
	for _, start := range []string{"", "board,rev", "board,revision,network\n", "board,revision,network\nA,1,ba", "board,revision,network\n\"A"} {
		_, err := readAll(ReadCSV(broken{strings.NewReader(start)}))
		if err == nil || !strings.Contains(err.Error(), "the disk went away") {
			t.Errorf("after %q: %v", start, err)
		}
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
		{"no column like it", "board,revision,network,id\n", []string{"column 4 \"id\" is not one of the columns\n", "the columns are board, revision"}},
		{"header's quotation mark", "board,\"revi\"sion\n", []string{"line 1, character", "twice"}},
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
