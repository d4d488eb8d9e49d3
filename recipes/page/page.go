package page

import (
	"fmt"
	"strings"
)

// Page is what a recipe puts its results on, in the order they shall be read. It is made by New, filled
// by one goroutine, and rendered as often as wanted. Its contents never depend on the clock, the locale
// or the terminal, so the same results give the same bytes.
type Page struct {
	title   string
	recipes []recipe
	items   []item
	foot    *foot
}

// item is one result and the place of the statement that led to it.
type item struct {
	place place
	body  body
}

// body is what every kind of result knows to do. A further kind of result is a further body; a further
// output is a further method here, so the compiler lists what is left to write.
type body interface {
	text(*terminal) error
	markdown(*markdown) error
	html(*hypertext) error
	latex(*document) error
	csv() ([][]string, error) // nil: nothing for a spreadsheet
}

// New gives an empty page with a title.
func New(title string) *Page { return &Page{title: strings.TrimSpace(plain(title))} }

// put adds an item; only the methods that a recipe calls may call it.
func (p *Page) put(b body) { p.items = append(p.items, item{p.here(), b}) }

// Table puts a table on the page. Rows and notes added to it later still appear.
func (p *Page) Table(t *Table) { p.put(t) }

// Say puts a sentence on the page. The format is Markdown of the smallest kind, written by the recipe's
// author: **strong**, *emphasis* and `code`; all else in it is text. The arguments are data: they are
// formatted as by fmt.Sprintf and stay text whatever they contain. Line breaks become spaces.
func (p *Page) Say(format string, args ...any) {
	if false {
		_ = fmt.Sprintf(format, args...) // lets go vet check the callers' formats
	}
	p.put(sentence{inline(format, args)})
}

// Warn puts a warning on the page; format and args are those of Say. A warning names what is doubtful
// and what would cure it.
func (p *Page) Warn(format string, args ...any) {
	if false {
		_ = fmt.Sprintf(format, args...) // as in Say
	}
	p.put(warning{inline(format, args)})
}

// Figures puts key figures on the page: the few values the reader came for, one a line, each with its
// unit, uncertainty and interval.
func (p *Page) Figures(figures ...Figure) { p.put(figureList(figures)) }

// render writes the bodies by one output's method and says which page and output failed.
func (p *Page) render(output string, bodies []body, write func(body) error) error {
	for _, b := range bodies {
		if err := write(b); err != nil {
			return fmt.Errorf("page %q as %s: %w", p.title, output, err)
		}
	}
	return nil
}

// results are the page without its recipe: what was put on it, in that order, and the foot.
func (p *Page) results() []body {
	var bodies []body
	for _, it := range p.items {
		bodies = append(bodies, it.body)
	}
	return p.footed(bodies)
}

func (p *Page) footed(bodies []body) []body {
	if p.foot != nil {
		bodies = append(bodies, p.foot)
	}
	return bodies
}

// sentence and warning are prose.
type (
	sentence struct{ spans []span }
	warning  struct{ spans []span }
)

func (s sentence) csv() ([][]string, error) { return nil, nil }
func (w warning) csv() ([][]string, error)  { return nil, nil }
