package page_test

import (
	"bytes"
	"encoding/csv"
	"strings"
	"testing"
	"unicode"

	"github.com/yuin/goldmark"
	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/extension"
	east "github.com/yuin/goldmark/extension/ast"
	"github.com/yuin/goldmark/text"
	"github.com/yuin/goldmark/util"
	"pgregory.net/rapid"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// hostile maps what somebody may write into a note to what a page shows of it.
var hostile = map[string]string{
	"\x1b[31mred\x1b[0m":             `\x1b[31mred\x1b[0m`, // terminal colours
	"\x1b]0;title\x07":               `\x1b]0;title\x07`,   // window title
	"\u009b2J":                       `\x9b2J`,             // the one-byte form of ESC [
	"two\nlines\r\nof\ttext":         "two lines of text",
	"back\b\x7f\x00":                 `back\x08\x7f\x00`,
	"a|b":                            "a|b",
	`a\|b\`:                          `a\|b\`,
	"safe \u202e fdp.exe":            `safe \u202e fdp.exe`, // right-to-left override
	"\u2066isolate\u2069\u061c":      `\u2066isolate\u2069\u061c`,
	"zero\u200bwidth\ufeff":          `zero\u200bwidth\ufeff`,
	"tag\U000E0041":                  `tag\U000e0041`,
	"bad \xff utf-8":                 "bad \ufffd utf-8",
	"=1+1":                           "=1+1",
	"+1":                             "+1",
	"-1":                             "-1",
	"@SUM(A1)":                       "@SUM(A1)",
	"\t=1":                           " =1",
	"＝1":                             "＝1",
	"<b>bold</b> &amp; <!-- x":       "<b>bold</b> &amp; <!-- x",
	"**x** _y_ ~~z~~ `c`":            "**x** _y_ ~~z~~ `c`",
	"[a](http://x.invalid) ![i](j":   "[a](http://x.invalid) ![i](j",
	"http://x.invalid www.x.invalid": "http://x.invalid www.x.invalid",
	"who@x.invalid":                  "who@x.invalid",
	"# head":                         "# head",
	"1. one":                         "1. one",
	"> quote":                        "> quote",
	"%d %s %!":                       "%d %s %!",
	"\U000F0000\U000F0001":           "\U000F0000\U000F0001",     // the marks the page uses itself
	"\u05e9\u05dc\u05d5\u05dd":       "\u05e9\u05dc\u05d5\u05dd", // right-to-left letters are letters
}

// pageWith puts s everywhere a page takes text from outside.
func pageWith(s string) *page.Page {
	p := page.New("T")
	t := page.NewTable("table", page.Label("label", "label"), page.Words("note", "note"))
	t.Row(s, s).Note("Note on %s.", s)
	t.Note("%s", s)
	p.Table(t)
	p.Say("%s", s)
	p.Say("It reads **%s** here.", s)
	p.Warn("See %s.", s)
	p.Figures(page.Figure{Name: s, CSV: "x", Value: s, Remark: s})
	return p
}

func TestHostileTextInTheTerminal(t *testing.T) {
	for in, want := range hostile {
		var b bytes.Buffer
		if err := pageWith(in).Text(&b, page.TextOptions{Width: 200}); err != nil {
			t.Fatal(err)
		}
		if n := strings.Count(b.String(), want); n < 8 {
			t.Errorf("%q is shown as %q %d times, want 8 or more:\n%s", in, want, n, b.String())
		}
		checkClean(t, in, b.String())
	}
}

// checkClean looks for what moves a terminal's cursor or turns its writing round.
func checkClean(t *testing.T, in, out string) {
	t.Helper()
	for _, r := range out {
		if r != '\n' && unicode.IsControl(r) || unicode.Is(unicode.Bidi_Control, r) {
			t.Errorf("%q leaves %U in the output", in, r)
		}
	}
}

func TestHostileTextInMarkdown(t *testing.T) {
	for in, want := range hostile {
		var b bytes.Buffer
		if err := pageWith(in).Markdown(&b, page.MarkdownOptions{}); err != nil {
			t.Fatal(err)
		}
		checkClean(t, in, b.String())
		checkMarkdown(t, b.Bytes(), in, want)
	}
}

// failer is *testing.T or *rapid.T.
type failer interface {
	Errorf(string, ...any)
	Helper()
}

// checkMarkdown reads the page back with goldmark, as GitHub would, and compares structure and text.
func checkMarkdown(t failer, src []byte, in, want string) {
	t.Helper()
	md := goldmark.New(goldmark.WithExtensions(extension.GFM))
	doc := md.Parser().Parse(text.NewReader(src))
	var blocks, cells []string
	_ = ast.Walk(doc, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		if !entering {
			return ast.WalkContinue, nil
		}
		switch n := n.(type) {
		case *ast.Link, *ast.AutoLink, *ast.Image, *ast.RawHTML, *ast.HTMLBlock, *ast.List, *ast.CodeSpan,
			*ast.CodeBlock, *ast.FencedCodeBlock, *ast.ThematicBreak, *east.Strikethrough:
			t.Errorf("%q becomes a %s:\n%s", in, n.Kind(), src)
		case *ast.Paragraph:
			blocks = append(blocks, plainText(n, src))
		case *east.TableCell:
			cells = append(cells, plainText(n, src))
		}
		return ast.WalkContinue, nil
	})
	squeezed := strings.TrimSpace(want)
	wantBlocks := []string{"table", "a Note on " + want + ".", squeezed, squeezed, "It reads " + want + " here.",
		"Warning: See " + want + "."}
	if got := strings.Join(blocks, "\n"); got != strings.Join(wantBlocks, "\n") {
		t.Errorf("%q: paragraphs read\n%s\nwant\n%s\nin\n%s", in, got, strings.Join(wantBlocks, "\n"), src)
	}
	wantCells := []string{"label", "note", "", squeezed, squeezed, "a",
		"Quantity", "Value", "Remark", squeezed, squeezed, squeezed}
	if got := strings.Join(cells, "\n"); got != strings.Join(wantCells, "\n") {
		t.Errorf("%q: cells read\n%s\nwant\n%s\nin\n%s", in, got, strings.Join(wantCells, "\n"), src)
	}
}

// plainText is a block's text as a reader sees it.
func plainText(n ast.Node, src []byte) string {
	var b strings.Builder
	_ = ast.Walk(n, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		if t, ok := n.(*ast.Text); ok && entering {
			v := util.UnescapePunctuations(t.Segment.Value(src))
			b.Write(v)
			if t.SoftLineBreak() || t.HardLineBreak() {
				b.WriteString("<break>")
			}
		}
		if s, ok := n.(*ast.String); ok && entering {
			b.Write(s.Value)
		}
		return ast.WalkContinue, nil
	})
	return b.String()
}

// Whatever printable text comes in reads back from Markdown unchanged.
func TestAnyTextSurvivesMarkdown(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.StringOfN(rapid.RuneFrom([]rune("ab1 .)(|\\`*_[]<>&;:/@!#~$+-=\"'{}^wé–")), 1, 24, -1).
			Filter(func(s string) bool { return strings.TrimSpace(s) == s && s != "" }).Draw(t, "s")
		var b bytes.Buffer
		if err := pageWith(s).Markdown(&b, page.MarkdownOptions{}); err != nil {
			t.Fatal(err)
		}
		checkMarkdown(t, b.Bytes(), s, s)
	})
}

func TestHostileTextInCSV(t *testing.T) {
	for in, shown := range hostile {
		var b bytes.Buffer
		if err := pageWith(in).CSV(&b); err != nil {
			t.Fatal(err)
		}
		checkClean(t, in, b.String())
		r := csv.NewReader(strings.NewReader(b.String()))
		r.FieldsPerRecord = -1
		records, err := r.ReadAll()
		if err != nil || len(records) != 4 {
			t.Fatalf("%q: %d records, %v:\n%s", in, len(records), err, b.String())
		}
		for _, got := range []string{records[1][0], records[1][1], records[3][1], records[3][5]} {
			if strings.TrimPrefix(got, "'") != shown {
				t.Errorf("%q in CSV reads %q, want %q", in, got, shown)
			}
			first := []rune(strings.TrimLeft(got, " "))[0]
			if strings.ContainsRune("=+-@＝＋－＠", first) {
				t.Errorf("%q in CSV reads %q, which a spreadsheet computes", in, got)
			}
		}
	}
}

func TestNumbersInCSVAreNotGuarded(t *testing.T) {
	p := page.New("T")
	tb := page.NewTable("table", page.Measured("drift", quantity.Ratio, "drift"), page.Label("name", "name"))
	tb.Row(-1.5, "-1.5")
	tb.Row(snubber.Estimate{Value: -2, U: 0.1}, nil)
	p.Table(tb)
	var b bytes.Buffer
	if err := p.CSV(&b); err != nil {
		t.Fatal(err)
	}
	if got, want := b.String(), "drift,drift_u,name\n-1.5,,'-1.5\n-2,0.1,\n"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
}

// The page's own marks for arguments cannot be smuggled in through a format either.
func TestMarksInAFormat(t *testing.T) {
	p := page.New("T")
	p.Say("a \U000F0000 b %s", "data")
	var b bytes.Buffer
	if err := p.Text(&b, page.TextOptions{}); err != nil || !strings.Contains(b.String(), "a \ufffd b data\n") {
		t.Errorf("got %q, %v", b.String(), err)
	}
}

// A note of 10,000 characters is cut in the terminal and nowhere else.
func TestLongText(t *testing.T) {
	long := strings.Repeat("abcdefghi ", 1000) + "end"
	var term, md, sheet bytes.Buffer
	p := page.New("T")
	tb := page.NewTable("table", page.Label("label", "label"), page.Words("note", "note"))
	tb.Row(strings.Repeat("x", 10000), long)
	p.Table(tb)
	p.Figures(page.Figure{Name: strings.Repeat("y", 10000), CSV: "y", Value: strings.Repeat("z", 10000)})
	for _, err := range []error{p.Text(&term, page.TextOptions{}), p.Markdown(&md, page.MarkdownOptions{}), p.CSV(&sheet)} {
		if err != nil {
			t.Fatal(err)
		}
	}
	if n := strings.Count(term.String(), "\n"); n > 20 || !strings.Contains(term.String(), "…") {
		t.Errorf("%d lines in the terminal:\n%s", n, term.String())
	}
	for l := range strings.SplitSeq(term.String(), "\n") {
		if n := len([]rune(l)); n > 80 {
			t.Errorf("a line of %d columns: %s", n, l)
		}
	}
	if !strings.Contains(md.String(), "end |") || !strings.Contains(sheet.String(), "end\n") {
		t.Error("Markdown or CSV lost the end of the note")
	}
}
