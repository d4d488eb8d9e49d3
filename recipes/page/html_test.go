package page_test

import (
	"encoding/xml"
	"errors"
	"io"
	"regexp"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// endless are the elements that have no end, but text may not look like one.
var endless = regexp.MustCompile(`<((?:meta|hr|br)\b[^<>]*)>`)

// readHTML gives a page's elements in order, each with its attributes' names, and its text. What we write is XML but for
// the elements that have no end; a text that became markup would show as another element, or break it.
func readHTML(t failer, src string) (elements []string, text string) {
	t.Helper()
	d := xml.NewDecoder(strings.NewReader(endless.ReplaceAllString(src, "<$1/>")))
	var b strings.Builder
	var open []string
	for {
		tok, err := d.Token()
		if errors.Is(err, io.EOF) {
			break
		} else if err != nil {
			t.Errorf("%v in\n%s", err, src)
			break
		}
		switch tok := tok.(type) {
		case xml.StartElement:
			e := tok.Name.Local
			for _, a := range tok.Attr {
				e += " " + a.Name.Local
				if v := strings.ToLower(a.Value); strings.HasPrefix(a.Name.Local, "on") || a.Name.Local == "src" ||
					a.Name.Local == "href" && !strings.HasPrefix(v, "#") {
					t.Errorf("attribute %s=%q", a.Name.Local, a.Value)
				}
			}
			open = append(open, tok.Name.Local)
			if tok.Name.Local != "bdi" {
				elements = append(elements, e)
			}
			if tok.Name.Local == "script" || tok.Name.Local == "img" || tok.Name.Local == "iframe" || tok.Name.Local == "link" {
				t.Errorf("an element %s", e)
			}
		case xml.EndElement:
			open = open[:len(open)-1]
		case xml.CharData:
			if len(open) > 0 && open[len(open)-1] != "style" {
				b.Write(tok)
			}
		case xml.Comment:
			t.Errorf("a comment in the page: %s", tok)
		}
	}
	return elements, b.String()
}

func TestHostileTextInHTML(t *testing.T) {
	wantElements, _ := readHTML(t, write(t, pageWith("benign"), "html"))
	for in, want := range hostile {
		src := write(t, pageWith(in), "html")
		checkClean(t, in, src)
		elements, text := readHTML(t, src)
		if !slices.Equal(elements, wantElements) {
			t.Errorf("%q changes the elements to %v, want %v", in, elements, wantElements)
		}
		if n := strings.Count(text, want); n < 9 {
			t.Errorf("%q is shown as %q %d times, want 9 or more:\n%s", in, want, n, text)
		}
	}
}

func TestAnyTextSurvivesHTML(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.StringOfN(rapid.RuneFrom([]rune("ab1 .)(|\\`*_[]<>&;:/@!#~$+-=\"'{}^wé–א")), 1, 24, -1).
			Filter(func(s string) bool { return strings.TrimSpace(s) == s && s != "" }).Draw(t, "s")
		var b strings.Builder
		if err := pageWith(s).HTML(&b); err != nil {
			t.Fatal(err)
		}
		if _, text := readHTML(t, b.String()); strings.Count(text, s) < 9 {
			t.Errorf("%q is lost in\n%s", s, text)
		}
	})
}

// What runs from right to left is set apart, so that it does not turn its neighbours round.
func TestRightToLeftIsIsolated(t *testing.T) {
	src := write(t, pageWith("\u05e9\u05dc\u05d5\u05dd 12"), "html")
	if n := strings.Count(src, "<bdi>\u05e9\u05dc\u05d5\u05dd 12</bdi>"); n < 9 {
		t.Errorf("isolated %d times, want 9 or more:\n%s", n, src)
	}
	if strings.Contains(write(t, pageWith("\u00e9\u03a9\u4e2d"), "html"), "<bdi>") {
		t.Error("text that runs from left to right is isolated too")
	}
}

// The page is one that a screen reader and a printer can use.
func TestHTMLStructure(t *testing.T) {
	p, _ := ladderPage(t, 38e6, 31e6, 28e6)
	src := write(t, p, "html")
	elements, text := readHTML(t, src)
	count := func(name string) int {
		n := 0
		for _, e := range elements {
			if e == name || strings.HasPrefix(e, name+" ") {
				n++
			}
		}
		return n
	}
	for name, want := range map[string]int{"main": 1, "h1": 1, "h2": 1, "title": 1, "html lang": 1, "caption id": 2, "footer": 1, "style": 1, "details": 5, "summary": 5} {
		if got := count(name); got != want {
			t.Errorf("%d of %s, want %d", got, name, want)
		}
	}
	if got := count("th scope"); got != 6+3+3+1 {
		t.Errorf("%d heads with a scope", got)
	}
	for _, want := range []string{"Table 1 Trials of the ladder", "Table 2 Key figures", "ring / MHz"} {
		if !strings.Contains(strings.ReplaceAll(text, "\u00a0", " "), want) {
			t.Errorf("no %q in the text", want)
		}
	}
	for _, want := range []string{`content="default-src 'none'; style-src 'unsafe-inline'`, `<a href="#table-1-a">a</a>`} {
		if !strings.Contains(src, want) {
			t.Errorf("no %s in the page", want)
		}
	}
}

// Decimal points come under one another by what is added unseen, and the text stays the number alone.
func TestNumbersLineUpInHTML(t *testing.T) {
	tb := page.NewTable("", page.Label("_", "_"), page.Measured("L", quantity.Inductance, "l"))
	for _, v := range []any{snubber.Estimate{Value: 12.34e-9, U: 0.56e-9}, snubber.Reading{Value: 412.3e-9, U: 11e-9}, 5e-9, nil} {
		tb.Row("_", v)
	}
	p := page.New("T")
	p.Table(tb)
	src := write(t, p, "html")
	for _, want := range []string{`<td class="n">12.34(56)</td>`, `<td class="n" data-pad="00.">412(11)</td>`, `<td class="n" data-pad="0000.()">5</td>`,
		`<td class="n" data-pad="0000.()">–</td>`} {
		if !strings.Contains(src, want) {
			t.Errorf("no %s in\n%s", want, src)
		}
	}
}

// A recipe's author writes Markdown, and no HTML, no picture from elsewhere and no script.
func TestProseIsNoHTML(t *testing.T) {
	src := write(t, func() *page.Page { p, _ := ladderPage(t, 1e6); return p }(), "html")
	if !strings.Contains(src, "its &lt;b&gt;peak&lt;/b&gt;, and no.") || strings.Contains(src, "pictures.invalid") {
		t.Errorf("got\n%s", src)
	}
}

// A note of 10,000 characters is whole on the page, and may be broken anywhere.
func TestLongTextInHTML(t *testing.T) {
	p := page.New("T")
	tb := page.NewTable("table", page.Label("label", "label"), page.Words("note", "note"))
	long := strings.Repeat("x", 10000)
	tb.Row(long, long)
	p.Table(tb)
	p.Say("%s", long)
	src := write(t, p, "html")
	if strings.Count(src, long) != 3 || !strings.Contains(src, `<th scope="row" class="w">`+long) || !strings.Contains(src, `<td class="w">`+long) {
		t.Error("the text is not there three times, in cells that may be broken")
	}
	tex := write(t, p, "tex")
	if n := strings.Count(strings.ReplaceAll(tex, `\allowbreak{}`, ""), long); n != 3 || strings.Count(tex, "allowbreak") < 1000 {
		t.Errorf("LaTeX has it %d times, or without places to break it", n)
	}
}
