package page_test

import (
	"bytes"
	"errors"
	"io"
	"math"
	"strings"
	"testing"
	"time"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// render gives the page in all its outputs, or the first error.
func render(t *testing.T, p *page.Page) (text, markdown, sheet string, err error) {
	t.Helper()
	var a, b, c bytes.Buffer
	err = errors.Join(p.Text(&a, page.TextOptions{}), p.Markdown(&b, page.MarkdownOptions{}), p.CSV(&c))
	if err != nil && a.Len()+b.Len()+c.Len() > 0 {
		// Figures have nothing to fail in one output and not in the others.
		t.Errorf("something was written beside the error %v", err)
	}
	return a.String(), b.String(), c.String(), err
}

func TestBadTables(t *testing.T) {
	bus := page.Number("bus", quantity.Voltage, "bus_v")
	ring := page.Measured("ring", quantity.Frequency, "ring_hz")
	note := page.Words("note", "note")
	at := page.Instant("read", "at")
	for name, c := range map[string]struct {
		table func() *page.Table
		want  []string
	}{
		"nil":        {func() *page.Table { return nil }, []string{"nil table", "page.NewTable"}},
		"no columns": {func() *page.Table { return page.NewTable("Empty") }, []string{`table "Empty"`, "no columns"}},
		"short row": {func() *page.Table {
			tb := page.NewTable("Trials", bus, note)
			tb.Row(48.0, "")
			tb.Row(48.0)
			return tb
		}, []string{`table "Trials", row 2`, "1 cells for 2 columns", "nil where there is nothing"}},
		"long row": {func() *page.Table {
			tb := page.NewTable("Trials", bus)
			tb.Row(48.0, 1.0)
			return tb
		}, []string{`table "Trials", row 1`, "2 cells for 1 columns"}},
		"text for a number": {func() *page.Table {
			tb := page.NewTable("Trials", bus)
			tb.Row("48")
			return tb
		}, []string{`table "Trials", row 1, column "bus"`, "string", "float64"}},
		"number for text": {func() *page.Table {
			tb := page.NewTable("Trials", note)
			tb.Row(48.0)
			return tb
		}, []string{`column "note"`, "float64", "a string"}},
		"number for a time": {func() *page.Table {
			tb := page.NewTable("Trials", at)
			tb.Row(48.0)
			return tb
		}, []string{`column "read"`, "time.Time"}},
		"name used twice": {func() *page.Table {
			return page.NewTable("Trials", ring, page.Number("u", quantity.Frequency, "ring_hz_u"))
		}, []string{`table "Trials"`, `"ring_hz_u"`, "twice"}},
		"no name": {func() *page.Table { return page.NewTable("Trials", page.Words("x", "")) }, []string{`""`, "empty"}},
	} {
		t.Run(name, func(t *testing.T) {
			p := page.New("P")
			p.Say("before")
			p.Table(c.table())
			_, _, _, err := render(t, p)
			if err == nil {
				t.Fatal("no error")
			}
			for _, w := range append(c.want, `page "P" as text`) {
				if !strings.Contains(err.Error(), w) {
					t.Errorf("error %q does not say %q", err, w)
				}
			}
		})
	}
	p := page.New("P")
	p.Figures(page.Figure{Name: "L", Value: true})
	if _, _, _, err := render(t, p); err == nil || !strings.Contains(err.Error(), `figure 1, column "L": a cell of type bool`) {
		t.Errorf("a figure of type bool: %v", err)
	}
}

func TestOddNumbers(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	tb := page.NewTable("Odd",
		page.Measured("x", quantity.Inductance, "x_h"),
		page.Number("y", quantity.Voltage, "y_v"),
		page.Interval("z", quantity.Frequency, "z_hz"),
		page.Part("c", quantity.Capacitance, "c"),
		page.Percent("p", "p"))
	for _, v := range []float64{nan, inf, -inf, 0, math.Copysign(0, -1), 1e300, -1e300, 5e-324, 1e-9} {
		for _, u := range []float64{0, nan, inf, -1, 1e300, 5e-324, 1e-10} {
			tb.Row(snubber.Estimate{Value: v, U: u}, v, snubber.Estimate{Value: v, U: u, Low: nan, High: inf}, v, v)
		}
	}
	p := page.New("P")
	p.Table(tb)
	p.Figures(page.Figure{Name: "f", Value: snubber.Estimate{Value: nan, U: inf, Low: -inf, High: nan}})
	text, _, sheet, err := render(t, p)
	if err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(text, "NaN") || !strings.Contains(sheet, "NaN,") || !strings.Contains(sheet, "-Inf") {
		t.Error("a value that is no number is hidden")
	}
}

func TestEmptyPageAndTable(t *testing.T) {
	p := page.New("")
	p.Figures()
	p.Say("")
	p.Table(page.NewTable("None yet", page.Label("trial", "trial")))
	text, md, sheet, err := render(t, p)
	if err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(text, "no rows") || !strings.Contains(md, "no rows") || sheet != "trial\n" {
		t.Errorf("text %q\nmarkdown %q\nCSV %q", text, md, sheet)
	}
}

// The decimal points of a column stand under each other, and one prefix serves them all.
func TestNumbers(t *testing.T) {
	for _, c := range []struct {
		column page.Column
		cells  []any
		want   string // head and cells, less the spaces that all the cells begin with
	}{
		{page.Number("U", quantity.Voltage, "u"), []any{48.0, 48.5, 400.0}, "U / V; 48.0; 48.5;400.0"},
		{page.Number("U", quantity.Voltage, "u"), []any{48.0, 400.0, nil}, "U / V; 48;400;  –"},
		{page.Number("n", quantity.Ratio, "n"), []any{12345678, 7}, "n;12345678;       7"},
		{page.Number("C", quantity.Capacitance, "c"), []any{470e-12, 2.2e-9}, "C / nF;0.47;2.20"},
		{page.Number("T", quantity.Temperature, "t"), []any{25.0, -40.0}, "T / °C; 25;-40"},
		{page.Percent("tol", "t"), []any{0.05, 0.2}, "tol / %; 5;20"},
		{page.Measured("L", quantity.Inductance, "l"), []any{snubber.Estimate{Value: 12.34e-9, U: 0.56e-9},
			snubber.Reading{Value: 412.3e-9, U: 11e-9}, 5e-9}, "L / nH; 12.34(56);412(11);  5"},
		{page.Measured("L", quantity.Inductance, "l"), []any{snubber.Estimate{Value: 3e-9, U: 560e-9}}, "L / nH;0(560)"},
		{page.Measured("R", quantity.Resistance, "r"), []any{snubber.Estimate{Value: 100, U: math.NaN()}}, "R / Ω;100(?)"},
		{page.Part("R", quantity.Resistance, "r"), []any{4700.0, 0.47, 10.0, 4712.0}, "R;     4k7;     R47;     10R;4.712 kΩ"},
		{page.Interval("L", quantity.Inductance, "l"),
			[]any{snubber.Estimate{Value: 36e-9, U: 0.4e-9, Low: 35.2e-9, High: 36.8e-9}, 3e-9}, "L / nH;35.20 to 36.80;             –"},
		{page.Instant("read", "at"), []any{time.Date(2031, 1, 2, 3, 4, 5, 0, time.UTC), time.Time{}}, "read (UTC);2031-01-02 03:04:05;–"},
		{page.Instant("read", "at"), []any{time.Date(2031, 1, 2, 3, 4, 0, 0, time.UTC),
			time.Date(2031, 7, 2, 3, 4, 0, 0, time.FixedZone("", 3600))}, "read;2031-01-02 03:04Z;2031-07-02 03:04+01:00"},
	} {
		tb := page.NewTable("", page.Label("_", "_"), c.column)
		for _, v := range c.cells {
			tb.Row("_", v)
		}
		p := page.New("")
		p.Table(tb)
		var b bytes.Buffer
		if err := p.Text(&b, page.TextOptions{}); err != nil {
			t.Fatal(err)
		}
		var got []string
		for l := range strings.SplitSeq(b.String(), "\n") {
			if rest, ok := strings.CutPrefix(l, "_  "); ok {
				got = append(got, rest)
			}
		}
		if g, w := strings.Join(dedent(got), ";"), c.want; g != strings.Join(dedent(strings.Split(w, ";")), ";") {
			t.Errorf("got  %q\nwant %q", g, w)
		}
	}
}

// dedent takes the spaces off that all the cells (not the head) begin with.
func dedent(lines []string) []string {
	out := append([]string(nil), lines...)
	if len(out) > 0 {
		out[0] = strings.TrimLeft(out[0], " ")
	}
	for len(out) > 1 {
		for _, l := range out[1:] {
			if !strings.HasPrefix(l, " ") {
				return out
			}
		}
		for i := range out[1:] {
			out[i+1] = out[i+1][1:]
		}
	}
	return out
}

// However narrow the terminal, no line is too long and no number is broken.
func TestNarrowTerminalBreaksNoNumber(t *testing.T) {
	for w := 40; w <= 140; w++ {
		var b bytes.Buffer
		if err := trialsPage().Text(&b, page.TextOptions{Width: w}); err != nil {
			t.Fatal(err)
		}
		for l := range strings.SplitSeq(b.String(), "\n") {
			if n := len([]rune(l)); n > w {
				t.Errorf("width %d: a line of %d: %s", w, n, l)
			}
		}
		for _, n := range []string{"41.570(50)", "41.470 to 41.670", "2031-03-14 09:30", "36.20(41) nH", "100p", "49.5"} {
			if !strings.Contains(b.String(), n) {
				t.Errorf("width %d: %s is broken or lost:\n%s", w, n, b.String())
			}
		}
	}
}

func TestSayIsTheSmallestMarkdown(t *testing.T) {
	p := page.New("T")
	p.Say("a **b %s** *c* `d` _e_ ***f*** [g](h) <i> # 1. \\*j\\*\nk %5.2f|%-4s|%[2]v", "x*y", 3.14159, "z")
	p.Say("**%s**", "")
	p.Say("**%s**end", " padded ")
	p.Say("`%s` and ``%s``", "a`b", "``")
	text, md, _, err := render(t, p)
	if err != nil {
		t.Fatal(err)
	}
	wantText := "a b x*y c d e f [g](h) <i> # 1. *j* k 3.14|z |3.14159"
	if !strings.Contains(strings.Join(strings.Fields(text), " "), wantText) {
		t.Errorf("text: got %q, want %q in it", text, wantText)
	}
	for _, want := range []string{
		"a **b x\\*y** *c* `d` *e* ***f*** \\[g\\](h) \\<i\\> \\# 1. \\*j\\* k  3.14\\|z   \\|3.14159\n",
		" **padded** end"[1:] + "\n",
		"``a`b`` and ``` `` ```\n",
	} {
		if !strings.Contains(md, want) {
			t.Errorf("Markdown: got\n%s\nwant %q in it", md, want)
		}
	}
	if strings.Contains(md, "****") {
		t.Errorf("empty strong text became a rule:\n%s", md)
	}
}

// broken is a full disk.
type broken struct{}

func (broken) Write([]byte) (int, error) { return 0, io.ErrShortWrite }

func TestWriteErrorsAreReported(t *testing.T) {
	p := trialsPage()
	for _, err := range []error{p.Text(broken{}, page.TextOptions{}), p.Markdown(broken{}, page.MarkdownOptions{}), p.CSV(broken{}),
		p.HTML(broken{}), p.LaTeX(broken{}, page.LaTeXOptions{})} {
		if !errors.Is(err, io.ErrShortWrite) || !strings.Contains(err.Error(), `page "Substitution`) {
			t.Errorf("got %v", err)
		}
	}
}
