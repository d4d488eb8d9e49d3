package page

import (
	"bytes"
	"fmt"
	"io"
	"slices"
	"strings"
)

// TextOptions says how the terminal's text is to look.
type TextOptions struct {
	Width  int  // columns of the terminal; 0: 80. Below 40 is taken as 40.
	Colour bool // bold heads and yellow warnings, by ECMA-48 sequences; false: plain text
	Prose  bool // also what the recipe says around its results, and its plots in words; false: figures and sentences alone
	Code   bool // also the recipe's code; it implies Prose
}

// Text writes the page as UTF-8 text for a terminal or a text file. Prose is wrapped to the width. Of a table
// that is too wide the heads are wrapped, then the prose columns; what still does not fit goes into a second
// table below that repeats the first column. Numbers are never broken. Nothing is written when there is an error.
func (p *Page) Text(w io.Writer, o TextOptions) error {
	if o.Width == 0 {
		o.Width = 80
	}
	t := &terminal{width: max(o.Width, 40), colour: o.Colour, code: o.Code}
	bodies := slices.DeleteFunc(p.results(), func(b body) bool { _, plot := b.(figure); return plot })
	if o.Prose || o.Code {
		var err error
		if bodies, err = p.woven(); err != nil {
			return err
		}
	}
	for _, l := range wrap(p.title, t.width) {
		t.line(t.strong(l))
	}
	t.line(strings.Repeat("═", min(width(p.title), t.width)))
	err := p.render("text", bodies, func(b body) error {
		if _, ok := b.(*listing); !ok || t.code {
			t.line("")
		}
		return b.text(t)
	})
	if err != nil {
		return err
	}
	if _, err := w.Write(t.buf.Bytes()); err != nil {
		return fmt.Errorf("page %q as text: %w", p.title, err)
	}
	return nil
}

// terminal gathers the text.
type terminal struct {
	buf    bytes.Buffer
	width  int
	colour bool
	code   bool
}

// line writes one line. No-break spaces have done their work by now and become spaces, which can be searched for.
func (t *terminal) line(s string) {
	t.buf.WriteString(strings.TrimRight(strings.ReplaceAll(s, "\u00a0", " "), " "))
	t.buf.WriteByte('\n')
}

// Colours are written here and not through go-pretty, whose colour switch is global.
func (t *terminal) strong(s string) string { return t.paint("1", s) }
func (t *terminal) yellow(s string) string { return t.paint("33", s) }

func (t *terminal) paint(sgr, s string) string {
	if !t.colour || s == "" {
		return s
	}
	return "\x1b[" + sgr + "m" + s + "\x1b[0m"
}

// hang writes wrapped text whose first line begins with lead and whose others are indented as far; shown is
// lead as painted.
func (t *terminal) hang(lead, shown, body string) {
	for i, l := range wrap(body, max(t.width-width(lead), 20)) {
		if i == 0 {
			t.line(shown + l)
		} else {
			t.line(strings.Repeat(" ", width(lead)) + l)
		}
	}
}

func (s sentence) text(t *terminal) error {
	t.hang("", "", flat(s.spans))
	return nil
}

func (w warning) text(t *terminal) error {
	t.hang("Warning: ", t.yellow("Warning:")+" ", flat(w.spans))
	return nil
}

func (t *Table) text(term *terminal) error {
	g, err := t.grid()
	if err != nil {
		return err
	}
	term.grid(g)
	return nil
}

func (fs figureList) text(t *terminal) error {
	g, err := fs.grid()
	if err != nil || len(g.rows) == 0 {
		return err
	}
	t.grid(g)
	return nil
}
