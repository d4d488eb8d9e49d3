package main

import (
	"bytes"
	"fmt"
	"os/exec"
	"slices"
	"strings"
	"testing"
	"unicode"

	"github.com/chromedp/chromedp"
)

// printed is what the probe says must come whole out of a printer.
type printed struct {
	Tables []struct {
		Short         bool
		Caption, Head string
		Rows          []string
	}
	Plots []string
	Foot  string
}

// TestPagesPrint prints the pages on A4 and Letter, and reads the PDF: no row of a table and no plot is cut between two sheets,
// a short table is on one, a long one has its head on each, the foot stands under something, and nothing runs over the edge.
func TestPagesPrint(t *testing.T) {
	pdftotext := needs(t, "pdftotext", "poppler-utils")
	chromium := browser(t)
	for _, f := range slices.Concat(demoFiles(t), captureFiles(t), hostileFiles(t), longFiles(t)) {
		t.Run(f.name, func(t *testing.T) {
			x := open(t, chromium, fileURL(f.path))
			x.look("print", "dark") // paper stays white
			want := eval[printed](x, x.probe+".printed()")
			for _, paper := range []struct {
				name   string
				size   chromedp.PaperSize
				inside int64 // px, of 1/96 inch: the sheet's width less twice the style sheet's margin of 16 mm
			}{
				{"A4", chromedp.PaperA4, 672},
				{"Letter", chromedp.PaperLetter, 695},
			} {
				x.size(paper.inside)
				x.finds("overflow", "printed on "+paper.name)
				x.finds("contrast", "printed on "+paper.name)
				pdf, err := chromedp.Run(x.ctx, chromedp.PrintToPDF(chromedp.PDFPaper(paper.size)))
				if err != nil {
					t.Fatal(err)
				}
				read := exec.Command(pdftotext, "-raw", "-enc", "UTF-8", "-", "-")
				read.Stdin = bytes.NewReader(pdf)
				text, err := read.Output()
				if err != nil {
					t.Fatal(err)
				}
				sheets := strings.Split(strings.TrimSuffix(string(text), "\f"), "\f")
				for i := range sheets {
					sheets[i] = bare(sheets[i])
				}
				for _, fault := range want.cut(sheets) {
					t.Errorf("%s: %s", paper.name, fault)
				}
			}
		})
	}
}

// bare is a text as it can be looked for in what is read from a PDF: without spaces and line breaks, hyphens, which pdftotext
// drops at the end of a line, and letters from right to left, whose order it changes.
func bare(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsSpace(r) || unicode.Is(unicode.Hebrew, r) || unicode.Is(unicode.Cf, r) || r == '-' {
			return -1
		}
		return r
	}, s)
}

// sheetful is about how many characters fill a sheet: a row with more cannot be on one, but nothing of it may be lost.
const sheetful = 2500

// cut says what is not whole on the sheets. The tables and plots come in their order, each from where the last one was.
func (p printed) cut(sheets []string) (faults []string) {
	whole := func(what string, text string, from int) int {
		text = bare(text)
		for i := from; i < len(sheets); i++ {
			if strings.Contains(sheets[i], text) {
				return i
			}
		}
		faults = append(faults, fmt.Sprintf("%s is whole on no sheet: %.200s", what, text))
		return from
	}
	at, long := 0, 0
	for _, t := range p.Tables {
		name := fmt.Sprintf("%.40s", t.Caption)
		at = whole(name+": caption and head", t.Caption+t.Head, at)
		first := at
		for i, row := range t.Rows {
			if len(row) > sheetful {
				long += strings.Count(row, "x")
				continue
			}
			at = whole(fmt.Sprintf("%s: row %d", name, i+1), row, at)
			switch {
			case i == 0 && at != first:
				faults = append(faults, fmt.Sprintf("%s: the caption is on sheet %d, the first row on sheet %d", name, first+1, at+1))
			case t.Short && at != first && !slices.ContainsFunc(t.Rows, func(r string) bool { return len(r) > sheetful }):
				faults = append(faults, fmt.Sprintf("%s: row %d is on sheet %d, the caption of this short table on %d", name, i+1, at+1, first+1))
			case !strings.Contains(sheets[at], bare(t.Head)):
				faults = append(faults, fmt.Sprintf("%s: no head on sheet %d", name, at+1))
			}
		}
	}
	if got := strings.Count(strings.Join(sheets, ""), "x"); got < long {
		faults = append(faults, fmt.Sprintf("rows of more than a sheet have %d letters x, of which %d are on the sheets", long, got))
	}
	at = 0
	for i, text := range p.Plots {
		at = whole(fmt.Sprintf("plot %d", i+1), text, at)
	}
	if p.Foot != "" {
		at = whole("the foot", p.Foot, len(sheets)-1)
		if others := len(sheets[at]) - len(bare(p.Foot)); others < len("12/34")+10 {
			faults = append(faults, fmt.Sprintf("the foot stands alone on sheet %d", at+1))
		}
	}
	return faults
}
