package page

import (
	"fmt"
	"runtime"
	"strings"
)

// Page is what a recipe puts its results on, in the order they shall be read. It is made by New, filled
// by one goroutine, and rendered as often as wanted. Its contents never depend on the clock, the locale
// or the terminal, so the same results give the same bytes.
type Page struct {
	title string
	items []item
}

// item is one result and the statements that led to it.
type item struct {
	origin origin
	body   body
}

// body is what every kind of result knows to do. A further kind of result is a further body; a further
// output is a further method here, so the compiler lists what is left to write.
type body interface {
	text(*terminal) error
	markdown(*strings.Builder) error
	csv() ([][]string, error) // nil: nothing for a spreadsheet
}

// origin is the call stack above the method that put an item on the page, innermost first. It is kept
// whole, not as one line, because a recipe may leave the making of a table to a function elsewhere, and
// the place of the result is then the recipe's own statement further up.
type origin []uintptr

// here records the stack above the exported method that calls it.
func here() origin {
	var pcs [32]uintptr
	return append(origin(nil), pcs[:runtime.Callers(3, pcs[:])]...)
}

// statement is the innermost source line of the stack: file and line of the call on the page.
func (o origin) statement() (file string, line int) {
	f, _ := runtime.CallersFrames(o).Next()
	return f.File, f.Line
}

// New gives an empty page with a title.
func New(title string) *Page { return &Page{title: strings.TrimSpace(plain(title))} }

// Table puts a table on the page. Rows and notes added to it later still appear.
func (p *Page) Table(t *Table) { p.items = append(p.items, item{here(), t}) }

// Say puts a sentence on the page. The format is Markdown of the smallest kind, written by the recipe's
// author: **strong**, *emphasis* and `code`; all else in it is text. The arguments are data: they are
// formatted as by fmt.Sprintf and stay text whatever they contain. Line breaks become spaces.
func (p *Page) Say(format string, args ...any) {
	if false {
		_ = fmt.Sprintf(format, args...) // lets go vet check the callers' formats
	}
	p.items = append(p.items, item{here(), sentence{inline(format, args)}})
}

// Warn puts a warning on the page; format and args are those of Say. A warning names what is doubtful
// and what would cure it.
func (p *Page) Warn(format string, args ...any) {
	if false {
		_ = fmt.Sprintf(format, args...) // as in Say
	}
	p.items = append(p.items, item{here(), warning{inline(format, args)}})
}

// Figures puts key figures on the page: the few values the reader came for, one a line, each with its
// unit, uncertainty and interval.
func (p *Page) Figures(figures ...Figure) {
	p.items = append(p.items, item{here(), figureList(figures)})
}

// sentence and warning are prose.
type (
	sentence struct{ spans []span }
	warning  struct{ spans []span }
)

func (s sentence) csv() ([][]string, error) { return nil, nil }
func (w warning) csv() ([][]string, error)  { return nil, nil }
