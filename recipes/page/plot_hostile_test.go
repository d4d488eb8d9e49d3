package page

import (
	"bytes"
	"encoding/xml"
	"io"
	"math"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"ringbook/snubber/quantity"
)

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
