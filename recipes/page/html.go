package page

import (
	"bytes"
	_ "embed"
	"fmt"
	"io"
)

//go:embed page.css
var css string

// policy lets an HTML page load nothing at all and run nothing (Content Security Policy Level 3, W3C).
const policy = "default-src 'none'; style-src 'unsafe-inline'; img-src data:; base-uri 'none'; form-action 'none'"

// hypertext gathers the HTML of a page.
type hypertext struct {
	bytes.Buffer
	tables, plots int
}

// HTML writes the page as one file of HTML (the Living Standard of the WHATWG) that needs no other: style and plots are
// inside it, and there is no script. A recipe's code is folded until asked for. It prints on A4 and Letter, is readable
// without colour, and follows the reader's choice of dark or light. Nothing is written when there is an error.
func (p *Page) HTML(w io.Writer) error {
	bodies, err := p.woven()
	if err != nil {
		return err
	}
	s := &hypertext{}
	s.WriteString("<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n" +
		"<meta http-equiv=\"Content-Security-Policy\" content=\"" + policy + "\">\n" +
		"<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n" +
		"<meta name=\"color-scheme\" content=\"light dark\">\n<title>")
	s.text(p.title)
	s.WriteString("</title>\n<style>\n" + css + "</style>\n</head>\n<body>\n<main>\n<h1>")
	s.isolate(p.title)
	s.WriteString("</h1>\n")
	if err := p.render("HTML", bodies, func(b body) error { return b.html(s) }); err != nil {
		return err
	}
	s.WriteString("</main>\n</body>\n</html>\n")
	if _, err := w.Write(s.Bytes()); err != nil {
		return fmt.Errorf("page %q as HTML: %w", p.title, err)
	}
	return nil
}

func (x sentence) html(s *hypertext) error {
	s.WriteString("<p>")
	s.spans(x.spans)
	s.WriteString("</p>\n")
	return nil
}

func (x warning) html(s *hypertext) error {
	s.WriteString("<p class=\"warning\" role=\"note\"><strong>Warning</strong> ")
	s.spans(x.spans)
	s.WriteString("</p>\n")
	return nil
}

func (f *failure) html(s *hypertext) error {
	s.WriteString("<p class=\"error\" role=\"note\"><strong>Error</strong> ")
	s.isolate(f.message)
	s.WriteString("</p>\n")
	return nil
}

func (f *foot) html(s *hypertext) error {
	s.WriteString("<footer>\n<dl>\n")
	for _, l := range f.lines() {
		s.WriteString("<div><dt>" + l.name + "</dt><dd>")
		s.isolate(l.value)
		s.WriteString("</dd></div>\n")
	}
	s.WriteString("</dl>\n</footer>\n")
	return nil
}

func (l *listing) html(s *hypertext) error {
	s.WriteString("<details><summary>")
	s.text(l.caption())
	s.WriteString("</summary>\n<pre tabindex=\"0\"><code>")
	for i, row := range l.lines {
		if i > 0 {
			s.WriteByte('\n')
		}
		s.text(row)
	}
	s.WriteString("</code></pre></details>\n")
	return nil
}

func (x prose) html(s *hypertext) error {
	doc, src := x.parse()
	return proseHTML().Render(s, src, doc)
}

func (t *Table) html(s *hypertext) error {
	g, err := t.grid()
	if err != nil {
		return err
	}
	s.grid(g)
	return nil
}

func (fs figureList) html(s *hypertext) error {
	g, err := fs.grid()
	if err != nil || len(g.rows) == 0 {
		return err
	}
	g.title = keyFigures
	for j := range g.columns { // quantities of different kinds have no common decimal point
		g.columns[j].align = left
	}
	s.grid(g)
	return nil
}
