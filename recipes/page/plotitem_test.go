package page_test

import (
	"bytes"
	"errors"
	"strings"
	"testing"

	"ringbook/recipes/page"
	"ringbook/snubber/quantity"
)

// plotPage has one plot, whose title is hostile.
func plotPage() *page.Page {
	x := page.LinearAxis("C added", quantity.Capacitance, "c_f")
	plot := page.NewPlot("Period & <b>capacitance</b> of B_1", x, page.LinearAxis("period", quantity.Time, "period_s"))
	plot.Points("read", []float64{1e-10, 2e-10}, []float64{1e-8, 2e-8})
	p := page.New("T")
	p.Plot(plot)
	return p
}

func TestPlotOnAPage(t *testing.T) {
	src := write(t, plotPage(), "html")
	_, text := readHTML(t, src)
	if !strings.Contains(text, "Figure 1 Period & <b>capacitance</b> of B_1") || strings.Count(src, `role="img" aria-label="Period &amp; &lt;b&gt;`) != 1 {
		t.Errorf("got\n%s", src)
	}
	if got := write(t, plotPage(), "txt"); !strings.Contains(got, "Plot: Period & <b>capacitance</b> of B_1") {
		t.Errorf("text: got\n%s", got)
	}
	if got := write(t, plotPage(), "csv"); !strings.Contains(got, "read,") {
		t.Errorf("CSV: got\n%s", got)
	}
	if got := write(t, plotPage(), "md"); !strings.Contains(got, `*Figure 1.* Period \& \<b\>`) || strings.Contains(got, "![") {
		t.Errorf("Markdown with nothing to keep plots: got\n%s", got)
	}
	if got := readLaTeX(t, write(t, plotPage(), "tex")); !strings.Contains(got, "Figure 1: Period & <b>") {
		t.Errorf("LaTeX with nothing to keep plots: got\n%s", got)
	}
}

func TestPlotsAreKeptBesideThePage(t *testing.T) {
	kept := map[string][]byte{}
	keep := func(name string, content []byte) (string, error) {
		kept[name] = content
		return "plots/" + name, nil
	}
	p := plotPage()
	var md, tex bytes.Buffer
	if err := errors.Join(p.Markdown(&md, page.MarkdownOptions{Keep: keep}), p.LaTeX(&tex, page.LaTeXOptions{Keep: keep})); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(md.String(), "](<plots/plot-1.svg>)\n\n*Figure 1.* Period ") || !bytes.HasPrefix(kept["plot-1.svg"], []byte("<svg ")) {
		t.Errorf("Markdown: got\n%s", md.String())
	}
	readLaTeX(t, tex.String())
	if !strings.Contains(tex.String(), "keepaspectratio]{plots/plot-1.png}") || !bytes.HasPrefix(kept["plot-1.png"], []byte("\x89PNG")) {
		t.Errorf("LaTeX: got\n%s", tex.String())
	}
}

func TestPlotsThatCannotBeKept(t *testing.T) {
	full := errors.New("no space left on device")
	for want, keep := range map[string]page.Keep{
		full.Error():                     func(string, []byte) (string, error) { return "", full },
		`"a}b" has characters that mean`: func(string, []byte) (string, error) { return "a}b", nil },
		`"" has characters that mean`:    func(string, []byte) (string, error) { return "", nil },
	} {
		var b bytes.Buffer
		for _, err := range []error{plotPage().Markdown(&b, page.MarkdownOptions{Keep: keep}), plotPage().LaTeX(&b, page.LaTeXOptions{Keep: keep})} {
			if err == nil || !strings.Contains(err.Error(), want) || !strings.Contains(err.Error(), `page "T" as `) || b.Len() > 0 {
				t.Errorf("got %v and %d bytes, want %q", err, b.Len(), want)
			}
		}
	}
	for output, render := range outputs {
		p := page.New("T")
		p.Plot(nil)
		if err := render(p, &bytes.Buffer{}); err == nil || !strings.Contains(err.Error(), "a nil plot; make one with page.NewPlot") {
			t.Errorf("%s of a nil plot: %v", output, err)
		}
	}
}
