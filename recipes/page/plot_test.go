package page

import (
	"bytes"
	"encoding/xml"
	"image/png"
	"io"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/plot/vg"
	"pgregory.net/rapid"

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

type fataler interface {
	Fatalf(string, ...any)
	Helper()
}

// wellFormed fails when the SVG is no XML, or holds what a page cannot take: a number that is none, a style, an
// identifier, a reference.
func wellFormed(t fataler, svg string) {
	t.Helper()
	d := xml.NewDecoder(strings.NewReader(svg))
	for {
		tok, err := d.Token()
		if err == io.EOF {
			break
		}
		if err != nil {
			t.Fatalf("not XML: %v\n%.2000s", err, svg)
		}
		if e, ok := tok.(xml.StartElement); ok {
			if !slices.Contains([]string{"svg", "path", "text"}, e.Name.Local) {
				t.Fatalf("element %s", e.Name.Local)
			}
			for _, a := range e.Attr {
				if slices.Contains([]string{"style", "id", "href", "width", "height", "onload"}, a.Name.Local) {
					t.Fatalf("attribute %s", a.Name.Local)
				}
				if a.Name.Local != "aria-label" && (strings.Contains(a.Value, "NaN") || strings.Contains(a.Value, "Inf")) {
					t.Fatalf("%s is %.200s", a.Name.Local, a.Value)
				}
			}
		}
	}
	if strings.HasPrefix(svg, "<?xml") {
		t.Fatalf("an XML prolog")
	}
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

// A single spike among a million samples is on the figure, at its height.
func TestThinningKeepsExtremes(t *testing.T) {
	pts := make([]vg.Point, 1_000_000)
	for i := range pts {
		pts[i] = vg.Point{X: length(i) * 370 / 1e6, Y: length(math.Sin(float64(i) / 5))}
	}
	pts[123_456].Y, pts[654_321].Y = 77, -88
	gap := vg.Point{X: length(math.NaN())}
	for i := 500_000; i < 510_000; i++ {
		pts[i] = gap
	}
	runs := thinLine(slices.Clone(pts), column)
	if len(runs) != 2 {
		t.Fatalf("%d runs, want 2: the gap is lost", len(runs))
	}
	n := 0
	for _, spike := range []int{0, 123_456, 499_999, 510_000, 654_321, 999_999} {
		found := false
		for _, r := range runs {
			found = found || slices.Contains(r, pts[spike])
		}
		if !found {
			t.Errorf("sample %d is lost", spike)
		}
	}
	for _, r := range runs {
		n += len(r)
		if !slices.IsSortedFunc(r, func(a, b vg.Point) int { return int(math.Copysign(1, float64(a.X-b.X))) }) {
			t.Error("the order of samples is lost")
		}
	}
	if n > 4*int(370/column)+8 {
		t.Errorf("%d vertices for %d columns", n, int(370/column))
	}
}

func TestThinningPointsKeepsTheFarthest(t *testing.T) {
	var pts []vg.Point
	for i := range 50_000 {
		pts = append(pts, vg.Point{X: length(i % 300), Y: length(i % 170)})
	}
	pts[40_001] = vg.Point{X: 150.1, Y: 170.3}
	low, high := make([]float64, len(pts)), make([]float64, len(pts))
	high[44_444] = 9
	keep := thinPoints(pts, low, high)
	if len(keep) > 6000 || !slices.Contains(keep, 40_001) || !slices.Contains(keep, 44_444) || !slices.IsSorted(keep) {
		t.Errorf("%d points kept; the highest %v, that with the highest bar %v", len(keep),
			slices.Contains(keep, 40_001), slices.Contains(keep, 44_444))
	}
}

// The whole circle x² + y² = 1 is traced as one closed line on which every point has radius 1.
func TestContourOfACircle(t *testing.T) {
	const n = 61
	at, z := make([][]vg.Point, n), make([][]float64, n)
	for i := range n {
		for j := range n {
			x, y := 4*float64(i)/(n-1)-2, 4*float64(j)/(n-1)-2
			at[i], z[i] = append(at[i], vg.Point{X: length(x * 100), Y: length(y * 100)}), append(z[i], x*x+y*y)
		}
	}
	lines := contour(at, z, 1)
	if len(lines) != 1 || lines[0][0] != lines[0][len(lines[0])-1] {
		t.Fatalf("%d lines, want one closed line", len(lines))
	}
	for _, q := range lines[0] {
		if r := math.Hypot(float64(q.X), float64(q.Y)); math.Abs(r-100) > 0.2 {
			t.Errorf("radius %g of 100", r)
		}
	}
	if l := float64(runLength(lines[0])); math.Abs(l-200*math.Pi) > 1 {
		t.Errorf("length %g, want %g", l, 200*math.Pi)
	}
	box := vg.Rectangle{Min: vg.Point{X: -300, Y: 0}, Max: vg.Point{X: 300, Y: 300}}
	rest := length(0)
	for _, run := range outside(lines[0], []vg.Rectangle{box}) {
		rest += runLength(run)
		for _, q := range run {
			if q.Y > 1e-9 {
				t.Errorf("a point at %v is within the box", q)
			}
		}
	}
	if math.Abs(float64(rest)-100*math.Pi) > 1 {
		t.Errorf("outside the upper half there are %g, want %g", rest, 100*math.Pi)
	}
	// What is no number is not joined across.
	z[30][30], z[2][2] = math.NaN(), math.NaN()
	if lines := contour(at, z, 1); len(lines) != 1 {
		t.Errorf("%d lines on a grid with holes that the line does not touch, want 1", len(lines))
	}
	z[45][30] = math.NaN() // at x = 1, y = 0
	if lines := contour(at, z, 1); len(lines) != 1 || lines[0][0] == lines[0][len(lines[0])-1] || runLength(lines[0]) > 620 {
		t.Errorf("%d lines of %v around a circle with a hole in it, want one that is open", len(lines), runLength(lines[0]))
	}
	saddle := contour([][]vg.Point{{{}, {Y: 100}}, {{X: 100}, {X: 100, Y: 100}}}, [][]float64{{1, 0}, {0, 1}}, 0.5)
	if len(saddle) != 2 {
		t.Errorf("%d lines on a saddle, want 2", len(saddle))
	}
}

func TestTextStaysText(t *testing.T) {
	evil := `</text><script>alert("1")</script> & 'x' ` + "\x1b[31m\u202e\x00\n" + strings.Repeat("ü", 10_000)
	p := NewPlot(evil, CategoryAxis(evil, "c", evil, "=b"), LinearAxis(evil, quantity.Voltage, "v").In(evil, 1))
	p.Points(evil, nil, []float64{1, 2}).K1([]float64{1, 1})
	p.Across(evil, 1.5)
	p.Upright(evil, 0.5)
	p.Mark(evil, 1, 1)
	svg := mustSVG(t, p)
	for _, s := range texts(svg) {
		if strings.ContainsAny(s, "\"'\x1b\u202e") || len([]rune(s)) > 600 {
			t.Errorf("text %q", s)
		}
	}
	if !strings.Contains(svg, "&lt;/text&gt;&lt;script") {
		t.Error("the markup is not on the figure as text")
	}
	if !strings.Contains(svg, "… (bars: k\u00a0=\u00a01)</text>") {
		t.Error("a long name hides what the bars are")
	}
	records, err := p.csv()
	if err != nil || records[2][1] != "'=b" {
		t.Errorf("CSV: %v, %v", records, err)
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

// A plot of anything is drawn or refused, never a panic; what is drawn is well formed, the same twice, and bounded.
func TestHostileData(t *testing.T) {
	value := rapid.OneOf(rapid.Float64Range(-10, 10), rapid.Float64(),
		rapid.SampledFrom([]float64{0, 1, -1, math.NaN(), math.Inf(1), math.Inf(-1), math.MaxFloat64, -math.MaxFloat64,
			math.SmallestNonzeroFloat64, 1e-300, 1e250, 1 + 1e-15, 1e9, 1e9 + 1e-6}))
	axis := func(t *rapid.T, x bool) Axis {
		name := rapid.StringN(0, 20, 60).Draw(t, "name")
		unit := quantity.Unit(rapid.IntRange(0, 10).Draw(t, "unit"))
		switch k := rapid.IntRange(0, 4).Draw(t, "scale"); {
		case k == 0:
			return LogAxis(name, unit, "c")
		case k == 1 && x:
			return CategoryAxis(name, "c", rapid.SliceOfN(rapid.String(), 0, 40).Draw(t, "categories")...)
		case k == 2:
			return LinearAxis(name, unit, "c").In("u", rapid.SampledFrom([]float64{1, -1, 1e18, 1e-30, 1e30}).Draw(t, "factor"))
		}
		return LinearAxis(name, unit, "c")
	}
	rapid.Check(t, func(t *rapid.T) {
		p := NewPlot(rapid.String().Draw(t, "title"), axis(t, true), axis(t, false))
		panels := []*Panel{&p.Panel}
		if rapid.Bool().Draw(t, "below") {
			panels = append(panels, p.Below(axis(t, false)))
		}
		positive := rapid.Bool().Draw(t, "positive") // so that logarithmic axes are drawn as well
		fix := func(v []float64) []float64 {
			for i := range v {
				if positive && v[i] <= 0 {
					v[i] = math.Max(-v[i], 1e-3)
				}
			}
			return v
		}
		for range rapid.IntRange(0, 4).Draw(t, "layers") {
			q := rapid.SampledFrom(panels).Draw(t, "panel")
			n := rapid.SampledFrom([]int{0, 1, 2, 3, 7, 40}).Draw(t, "n")
			values := func(name string) []float64 { return fix(rapid.SliceOfN(value, n, n).Draw(t, name)) }
			x, y := values("x"), values("y")
			if rapid.Bool().Draw(t, "sorted") {
				slices.Sort(x)
				slices.Sort(y)
			}
			name := rapid.StringN(0, 30, 90).Draw(t, "series")
			switch rapid.IntRange(0, 7).Draw(t, "kind") {
			case 0:
				q.Line(name, x, y)
			case 1:
				q.Points(name, x, y)
			case 2:
				q.Points(name, x, y).Interval95(values("low"), values("high")).Style(rapid.Int().Draw(t, "style"))
			case 3:
				q.Band(name, x, y, values("high"))
			case 4:
				z := make([][]float64, len(x))
				for i := range z {
					z[i] = fix(rapid.SliceOfN(value, len(y), len(y)).Draw(t, "z"))
				}
				c := q.Contours(axis(t, false), x, y, z)
				if rapid.Bool().Draw(t, "levels") {
					c.Levels(values("level")...)
				}
			case 5:
				q.Across(name, fix([]float64{value.Draw(t, "at")})[0])
			case 6:
				q.Upright(name, fix([]float64{value.Draw(t, "at")})[0])
			case 7:
				q.Mark(name, value.Draw(t, "markx"), value.Draw(t, "marky"))
			}
		}
		svg, err := p.SVG()
		if err != nil {
			if !strings.HasPrefix(err.Error(), "plot ") {
				t.Fatalf("error %q does not name the plot", err)
			}
			return
		}
		wellFormed(t, string(svg))
		again, _ := p.SVG()
		if !bytes.Equal(svg, again) {
			t.Fatalf("rendering twice gives different bytes")
		}
		if len(svg) > 1_000_000 {
			t.Fatalf("%d bytes", len(svg))
		}
		if _, err := p.csv(); err != nil {
			t.Fatalf("CSV: %v", err)
		}
		if err := p.PNG(io.Discard, 50); err != nil {
			t.Fatalf("PNG: %v", err)
		}
	})
}

// However wild, big data stay bounded: noise in every direction, gaps everywhere, a grid of noise.
func TestBigDataIsBounded(t *testing.T) {
	rng := uint64(1)
	random := func() float64 {
		rng = rng*6364136223846793005 + 1442695040888963407
		return float64(rng>>11) / (1 << 53)
	}
	n := 300_000
	x, y := make([]float64, n), make([]float64, n)
	for i := range x {
		x[i], y[i] = random(), random()
		if i%2 == 0 {
			y[i] = math.NaN()
		}
	}
	p := xy("to and fro, with gaps")
	p.Line("a", x, y)
	q := xy("points with bars")
	q.Points("a", x, y).Interval95(y, y)
	z := make([][]float64, 300)
	grid := make([]float64, 300)
	for i := range z {
		grid[i] = float64(i)
		for range 300 {
			z[i] = append(z[i], random())
		}
	}
	c := xy("a grid of noise")
	c.Contours(LinearAxis("z", quantity.Ratio, "z"), grid, grid, z)
	for p, most := range map[*Plot]int{p: 300_000, q: 300_000, c: 1_500_000} {
		if n := len(mustSVG(t, p)); n > most {
			t.Errorf("%s: %d bytes, more than %d", p.title, n, most)
		}
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
