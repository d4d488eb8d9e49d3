package page_test

import (
	"bytes"
	"flag"
	"math"
	"os"
	"path/filepath"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

var update = flag.Bool("update", false, "write the golden files anew")

// trialsPage is a page with every kind of item and of column, in an invented scenario.
func trialsPage() *page.Page {
	p := page.New("Substitution on winch-drive B, revision C")
	p.Say("The ring of **%d** trials falls on one line; the probe's %s are taken off. The *loop* below is the "+
		"board's own, and its intervals hold the spread of the repeats and the tolerance of the capacitors.",
		7, quantity.Format(8e-12, quantity.Capacitance, 1))
	p.Figures(
		page.Figure{Name: "loop inductance L", Unit: quantity.Inductance, CSV: "inductance_h",
			Value: snubber.Estimate{Value: 36.2e-9, U: 0.41e-9, Low: 35.4e-9, High: 37e-9}},
		page.Figure{Name: "node capacitance C", Unit: quantity.Capacitance, CSV: "capacitance_f",
			Value:  &snubber.Estimate{Value: 405e-12, U: 7.3e-12, Low: 390.7e-12, High: 419.3e-12},
			Remark: "with the switch off at 48 V; it rises at a lower bus voltage"},
		page.Figure{Name: "loop resistance r", Unit: quantity.Resistance, CSV: "resistance_ohm",
			Value: (*snubber.Estimate)(nil), Remark: "no decay was read"},
		page.Figure{Name: "damping ratio", CSV: "damping_ratio",
			Value: snubber.Estimate{Value: 0.0123, U: 0.0011, Low: 0.0101, High: 0.0145}},
		page.Figure{Name: "network", CSV: "network", Value: "10R + 1n5"},
	)
	t := page.NewTable("Trials of winch-drive B",
		page.Label("trial", "trial"),
		page.Instant("read", "at"),
		page.Part("C", quantity.Capacitance, "c"),
		page.Percent("tolerance", "c_tol"),
		page.Measured("ring frequency", quantity.Frequency, "ring_hz"),
		page.Interval("interval", quantity.Frequency, "ring_hz"),
		page.Number("bus", quantity.Voltage, "bus_v"),
		page.Number("records", quantity.Ratio, "records"),
		page.Words("note", "note"),
	)
	zone := time.FixedZone("", 2*3600)
	for i, c := range []float64{0, 100e-12, 470e-12, 2.2e-9} {
		var fitted, tolerance any
		if c > 0 {
			fitted, tolerance = c, 0.05
		}
		f := 1 / (2 * math.Pi * math.Sqrt(36.2e-9*(405e-12+c)))
		f = math.Round(f/1e4) * 1e4
		e := snubber.Estimate{Value: f, U: 50e3, Low: f - 100e3, High: f + 100e3}
		note := ""
		if i == 2 {
			note = "the ground spring had come loose; read again after fixing it, and the second reading is " +
				"the one kept here; the first one is struck, as the board's owner asked"
		}
		r := t.Row("T-00"+string(rune('1'+i)), time.Date(2031, 3, 14, 9, 30+4*i, 0, 0, zone), fitted, tolerance,
			e, e, 48+0.5*float64(i), 16, note)
		if i >= 2 {
			r.Note("The decay was not read: lengthen the record to %s.", quantity.Format(2e-6, quantity.Time, 1))
		}
		if i == 3 {
			r.Note("Set aside: above the capacitor's self-resonance.")
		}
	}
	t.Row("T-005", nil, nil, nil, nil, nil, nil, nil, nil)
	t.Note("Uncertainties are standard uncertainties (*k* = 1).")
	p.Table(t)
	p.Warn("All capacitors come from one reel, so that their error is common to all trials; measure one on a " +
		"meter and enter it as `c` with its uncertainty.")
	return p
}

func TestGolden(t *testing.T) {
	for name, render := range map[string]func(*page.Page, *bytes.Buffer) error{
		"wide.golden.txt":   func(p *page.Page, b *bytes.Buffer) error { return p.Text(b, page.TextOptions{Width: 130}) },
		"trials.golden.txt": func(p *page.Page, b *bytes.Buffer) error { return p.Text(b, page.TextOptions{}) },
		"narrow.golden.txt": func(p *page.Page, b *bytes.Buffer) error { return p.Text(b, page.TextOptions{Width: 40}) },
		"colour.golden.txt": func(p *page.Page, b *bytes.Buffer) error { return p.Text(b, page.TextOptions{Colour: true}) },
		"trials.golden.md":  func(p *page.Page, b *bytes.Buffer) error { return p.Markdown(b, page.MarkdownOptions{}) },
		"trials.golden.csv": func(p *page.Page, b *bytes.Buffer) error { return p.CSV(b) },
	} {
		t.Run(name, func(t *testing.T) {
			p := trialsPage()
			var got, again bytes.Buffer
			if err := render(p, &got); err != nil {
				t.Fatal(err)
			}
			if err := render(p, &again); err != nil || !bytes.Equal(got.Bytes(), again.Bytes()) {
				t.Errorf("rendering twice gives different bytes (err %v)", err)
			}
			file := filepath.Join("testdata", name)
			if *update {
				if err := os.WriteFile(file, got.Bytes(), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(string(want), got.String()); diff != "" {
				t.Errorf("differs from %s (-want +got); look, and run with -update if it is right:\n%s", file, diff)
			}
		})
	}
}

// A CJK locale makes go-pretty count – and … as two columns unless told otherwise; the page must not follow.
func TestLocaleChangesNothing(t *testing.T) {
	want, err := os.ReadFile("testdata/trials.golden.txt")
	if err != nil {
		t.Fatal(err)
	}
	text := runSelf(t, "LC_ALL=ja_JP.UTF-8")
	if diff := cmp.Diff(string(want), text); diff != "" {
		t.Errorf("under LC_ALL=ja_JP.UTF-8 (-want +got):\n%s", diff)
	}
}
