package page

import (
	"bytes"
	"strings"

	"github.com/yuin/goldmark/ast"
)

// markdown writes prose as it is, but for its headings, which go one level down: the page's title is the first.
func (p prose) markdown(b *markdown) error {
	doc, src := p.parse()
	deeper := map[int]bool{} // where a # is to be doubled
	_ = ast.Walk(doc, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		if h, ok := n.(*ast.Heading); ok && entering && h.Lines().Len() > 0 {
			start := h.Lines().At(0).Start
			line := bytes.LastIndexByte(src[:start], '\n') + 1
			if at := bytes.IndexByte(src[line:start], '#'); at < 0 {
				secondLevel(src[h.Lines().At(h.Lines().Len()-1).Stop:])
			} else if start-line-at < 7 {
				deeper[line+at] = true
			}
		}
		return ast.WalkContinue, nil
	})
	for i, c := range src {
		if deeper[i] {
			b.WriteByte('#')
		}
		b.WriteByte(c)
	}
	b.WriteByte('\n')
	return nil
}

// secondLevel turns the = below a heading, which would make it the page's title, into -.
func secondLevel(rest []byte) {
	for i, c := range rest {
		switch c {
		case '=':
			rest[i] = '-'
		case ' ', '\n':
		default:
			return
		}
	}
}

// markdown fences code with more backticks than it has in a row.
func (l *listing) markdown(b *markdown) error {
	body := strings.Join(l.lines, "\n")
	fence := "```"
	for strings.Contains(body, fence) {
		fence += "`"
	}
	if l.unreached {
		b.WriteString(escapeMarkdown(l.caption(), true) + ":\n\n")
	}
	b.WriteString(fence + "go\n" + body + "\n" + fence + "\n")
	return nil
}

func (f *failure) markdown(b *markdown) error {
	b.WriteString("> **Error:** " + escapeMarkdown(f.message, false) + "\n")
	return nil
}
