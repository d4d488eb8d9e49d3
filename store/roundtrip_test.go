package store

import (
	"bytes"
	"context"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"ringbook/snubber"
)

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
			t.Readings = append(t.Readings, snubber.Reading{Quantity: q, Value: positive.Draw(rt, "value"), U: maybe(positive), FromWaveform: rapid.Bool().Draw(rt, "from_waveform")})
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
	f.Add("from_waveform,board,revision,network,ring_hz,peak_v,temp_c\nring_hz  temp_c,A,1,bare,1M,2,3\n")
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
