package page

import (
	"bytes"
	"image/png"
	"io"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"ringbook/snubber/quantity"
)

func xy(title string) *Plot {
	return NewPlot(title, LinearAxis("time", quantity.Time, "time_s"), LinearAxis("voltage", quantity.Voltage, "v"))
}

func mustSVG(t testing.TB, p *Plot) string {
	t.Helper()
	b, err := p.SVG()
	if err != nil {
		t.Fatal(err)
	}
	wellFormed(t, string(b))
	return string(b)
}

// texts are the texts of an SVG.
func texts(svg string) []string {
	var out []string
	for _, m := range regexp.MustCompile(`<text[^>]*>([^<]*)</text>`).FindAllStringSubmatch(svg, -1) {
		out = append(out, m[1])
	}
	return out
}

func TestAxisTexts(t *testing.T) {
	for _, c := range []struct {
		axis      Axis
		low, high float64
		unit      string
		ticks     string
	}{
		{LinearAxis("C", quantity.Capacitance, ""), 0, 2.2e-9, "nF", "0.0 0.5 1.0 1.5 2.0"},
		{LinearAxis("C", quantity.Capacitance, ""), 0, 470e-12, "pF", "0 50 100 150 200 250 300 350 400 450"},
		{LinearAxis("v", quantity.Voltage, ""), -0.3, 0.3, "mV", "−300 −200 −100 0 100 200 300"},
		{LinearAxis("lc", quantity.Ratio, "").In("ns²", 1e18), 0, 9.3e-17, "ns²", "0 10 20 30 40 50 60 70 80 90"},
		{LinearAxis("share", quantity.Ratio, ""), 0, 1, "", "0.0 0.1 0.2 0.3 0.4 0.5 0.6 0.7 0.8 0.9 1.0"},
		{LinearAxis("share", quantity.Ratio, ""), 0, 3e-8, "1e-9", "0 5 10 15 20 25 30"},
		{LogAxis("f", quantity.Frequency, ""), 150e3, 300e6, "MHz", "0.2 0.5 1 2 5 10 20 50 100 200"},
		{LogAxis("R", quantity.Resistance, ""), 1, 100, "Ω", "1 2 5 10 20 50 100"},
		{LogAxis("C", quantity.Capacitance, ""), 100e-12, 10e-9, "nF", "0.1 0.2 0.5 1 2 5 10"},
		{LogAxis("f", quantity.Frequency, ""), 40e6, 44e6, "MHz", "40 41 42 43 44"},
		{LogAxis("f", quantity.Frequency, ""), 1, 1e9, "kHz", "0.01 1 100 10000 1e6"},
	} {
		r := newRuler(c.axis, reach{low: c.low, high: c.high, any: true}, func(s string) float64 { return 0.014 * float64(len([]rune(s))+3) })
		var labels []string
		for _, k := range r.ticks {
			if k.label != "" {
				labels = append(labels, k.label)
			}
			if k.at < -1e-9 || k.at > 1+1e-9 {
				t.Errorf("%s from %g: tick %q at %g, off the axis", c.axis.name, c.low, k.label, k.at)
			}
		}
		if got := strings.Join(labels, " "); got != c.ticks || r.symbol != c.unit {
			t.Errorf("%g to %g: in %q, ticks %q; want %q, %q", c.low, c.high, r.symbol, got, c.unit, c.ticks)
		}
	}
}

func TestMistakesAreErrors(t *testing.T) {
	log := func() *Plot {
		return NewPlot("T", LogAxis("frequency", quantity.Frequency, "f_hz"), LogAxis("level", quantity.Voltage, "v"))
	}
	one, two := []float64{1}, []float64{1, 2}
	for want, make := range map[string]func() *Plot{
		"2 values of x for 1 of y":             func() *Plot { p := xy("T"); p.Line("a", two, one); return p },
		"x is nil; only an axis of categories": func() *Plot { p := xy("T"); p.Points("a", nil, one); return p },
		"1 uncertainties for 2 points":         func() *Plot { p := xy("T"); p.Points("a", two, two).K1(one); return p },
		"uncertainty is -1 at index 1":         func() *Plot { p := xy("T"); p.Points("a", two, two).K1([]float64{1, -1}); return p },
		"1 lower and 2 upper ends":             func() *Plot { p := xy("T"); p.Points("a", two, two).Interval95(one, two); return p },
		"frequency is 0 at index 1":            func() *Plot { p := log(); p.Line("a", []float64{1, 0}, two); return p },
		"level is -3 at index 0":               func() *Plot { p := log(); p.Points("a", two, []float64{-3, 1}); return p },
		"level is -1 at index 0":               func() *Plot { p := log(); p.Across("a", -1); return p },
		"x does not ascend":                    func() *Plot { p := xy("T"); p.Band("a", []float64{2, 1}, two, two); return p },
		"1 lower ends for 2 upper":             func() *Plot { p := xy("T"); p.Band("a", two, one, two); return p },
		"1 columns of values for 2":            func() *Plot { p := xy("T"); p.Contours(p.y, two, two, [][]float64{two}); return p },
		"column 1 has 1 values for 2":          func() *Plot { p := xy("T"); p.Contours(p.y, two, two, [][]float64{two, one}); return p },
		"the grid's x or y does not":           func() *Plot { p := xy("T"); p.Contours(p.y, []float64{2, 1}, two, [][]float64{two, two}); return p },
		`"V" has categories; only`:             func() *Plot { return NewPlot("T", CategoryAxis("x", "x"), CategoryAxis("V", "v")) },
		"1 values for 2 categories": func() *Plot {
			p := NewPlot("T", CategoryAxis("x", "x", "a", "b"), xy("").y)
			p.Line("a", nil, one)
			return p
		},
		"x is 2 at index 0, and there are 2 categories": func() *Plot {
			p := NewPlot("T", CategoryAxis("x", "x", "a", "b"), xy("").y)
			p.Line("a", two[1:], one)
			return p
		},
		"give a factor from 1e-30":                          func() *Plot { return NewPlot("T", LinearAxis("x", quantity.Ratio, "x").In("u", 0), xy("").y) },
		`plot "T": series 2, "b": 2 values of x for 1 of y`: func() *Plot { p := xy("T"); p.Line("a", one, one); p.Line("b", two, one); return p },
	} {
		p := make()
		for name, render := range map[string]func() error{
			"SVG": func() error { _, err := p.SVG(); return err },
			"CSV": func() error { _, err := p.csv(); return err },
			"PNG": func() error { return p.PNG(io.Discard, 96) },
		} {
			if err := render(); err == nil || !strings.Contains(err.Error(), want) || !strings.Contains(err.Error(), `plot "T"`) {
				t.Errorf("%s: error %v, want one with %q", name, err, want)
			}
		}
	}
	if err := xy("T").PNG(io.Discard, 5); err == nil {
		t.Error("5 dots per inch are drawn")
	}
}

// What is not a number is left out: the line has a gap, and the axes do not see it.
func TestGaps(t *testing.T) {
	p := xy("T")
	p.Line("a", []float64{0, 1, 2, 3, 4, 5}, []float64{0, 1, math.NaN(), math.Inf(1), 1, 0})
	svg := mustSVG(t, p)
	line := regexp.MustCompile(`stroke-width="1.3" d="([^"]*)"`).FindStringSubmatch(svg)
	if line == nil || strings.Count(line[1], "M") != 2 {
		t.Errorf("path %q, want two pieces", line)
	}
	for _, c := range []*Plot{xy("T"), func() *Plot { p := xy("T"); p.Line("a", []float64{math.NaN()}, []float64{1}); return p }()} {
		if !slices.Contains(texts(mustSVG(t, c)), "no data") {
			t.Error("a plot of nothing does not say so")
		}
	}
}

// Values that are all equal stand in the middle of an axis that still has ticks.
func TestEqualValues(t *testing.T) {
	for _, a := range []Axis{LinearAxis("a", quantity.Voltage, ""), LogAxis("a", quantity.Voltage, "")} {
		r := newRuler(a, reach{low: 5, high: 5, any: true}, func(string) float64 { return 0.1 })
		if at := r.at(5); math.Abs(at-0.5) > 1e-9 || len(r.ticks) < 2 {
			t.Errorf("5 stands at %g among %d ticks", at, len(r.ticks))
		}
	}
}

// An error bar that reaches below zero on a logarithmic axis goes to the edge; its point and its axis stay.
func TestBarBeyondLogAxis(t *testing.T) {
	p := NewPlot("T", LinearAxis("x", quantity.Ratio, "x"), LogAxis("y", quantity.Voltage, "y"))
	p.Points("", []float64{1, 2}, []float64{1, 10}).Interval95([]float64{-1, 8}, []float64{3, 12})
	svg := mustSVG(t, p)
	bars := regexp.MustCompile(`stroke-width=".9" d="([^"]*)"`).FindStringSubmatch(svg)
	if bars == nil || strings.Count(bars[1], "M") != 7 { // four halves, three caps
		t.Errorf("bars %q, want four halves and three caps", bars)
	}
	if !slices.Contains(texts(svg), "10") || strings.Count(svg, "z\"/>") != 1 {
		t.Errorf("texts %q", texts(svg))
	}
}

func TestPlotCSV(t *testing.T) {
	p := xy("T")
	p.Points("trials", []float64{1e-9, 2e-9}, []float64{3, math.NaN()}).K1([]float64{0.5, 1})
	p.Band("band", []float64{1e-9}, []float64{2.5}, []float64{3.5})
	p.Across("limit", 5)
	p.Contours(LinearAxis("loss", quantity.Power, "loss_w"), []float64{0, 1}, []float64{7}, [][]float64{{8}, {9}})
	p.Below(LinearAxis("residual", quantity.Voltage, "residual_v")).Line("=r", []float64{1e-9}, []float64{0.1})
	got, err := p.csv()
	if err != nil {
		t.Fatal(err)
	}
	want := [][]string{
		{"series", "time_s", "v", "v_low", "v_high", "loss_w", "residual_v", "residual_v_low", "residual_v_high"},
		{"trials", "1e-09", "3", "2.5", "3.5", "", "", "", ""},
		{"trials", "2e-09", "NaN", "NaN", "NaN", "", "", "", ""},
		{"band", "1e-09", "", "2.5", "3.5", "", "", "", ""},
		{"limit", "", "5", "", "", "", "", "", ""},
		{"loss", "0", "7", "", "", "8", "", "", ""},
		{"loss", "1", "7", "", "", "9", "", "", ""},
		{"'=r", "1e-09", "", "", "", "", "0.1", "", ""},
	}
	if !slices.EqualFunc(got, want, slices.Equal[[]string]) {
		t.Errorf("CSV is\n%q, want\n%q", got, want)
	}
}

// The image has the size asked for, and is not blank.
func TestPNGSize(t *testing.T) {
	p := xy("T")
	p.Line("a", []float64{0, 1}, []float64{0, 1})
	var b bytes.Buffer
	if err := p.PNG(&b, 100); err != nil {
		t.Fatal(err)
	}
	m, err := png.Decode(&b)
	if err != nil {
		t.Fatal(err)
	}
	if s := m.Bounds().Size(); math.Abs(float64(s.X)-150/25.4*100) > 1 || math.Abs(float64(s.Y)-95/25.4*100) > 1 {
		t.Errorf("size %v, want 150 mm by 95 mm at 100 dots per inch", s)
	}
	r, g, bl, a := m.At(1, 1).RGBA()
	if r != 0xffff || g != 0xffff || bl != 0xffff || a != 0xffff {
		t.Error("the background is not white")
	}
}

func TestHundredths(t *testing.T) {
	for n, want := range map[int]string{0: "0", 5: ".05", 50: ".5", 100: "1", 105: "1.05", -5: "-.05", -1250: "-12.5", 42520: "425.2"} {
		if got := string(appendHundredths(nil, n)); got != want {
			t.Errorf("%s hundredths are %q, want %q", strconv.Itoa(n), got, want)
		}
	}
}
