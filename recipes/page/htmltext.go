package page

import (
	"unicode"

	"github.com/yuin/goldmark/renderer"
	"github.com/yuin/goldmark/renderer/html"
	"github.com/yuin/goldmark/util"
)

// proseHTML writes prose as goldmark does. Addresses that would run a script are dropped.
func proseHTML() renderer.Renderer {
	return renderer.NewRenderer(renderer.WithNodeRenderers(util.Prioritized(html.NewRenderer(), 1000)))
}

// text writes s as text, safe between tags and in a quoted attribute.
func (s *hypertext) text(str string) {
	from := 0
	for i := range len(str) {
		var escaped string
		switch str[i] {
		case '&':
			escaped = "&amp;"
		case '<':
			escaped = "&lt;"
		case '>':
			escaped = "&gt;"
		case '"':
			escaped = "&#34;"
		case '\'':
			escaped = "&#39;"
		default:
			continue
		}
		s.WriteString(str[from:i])
		s.WriteString(escaped)
		from = i + 1
	}
	s.WriteString(str[from:])
}

// isolate writes text from outside. Where it has letters that run from right to left it is isolated, so that what
// stands beside it keeps its order (Unicode Standard Annex 9, 2.4).
func (s *hypertext) isolate(str string) {
	if !rightToLeft(str) {
		s.text(str)
		return
	}
	s.WriteString("<bdi>")
	s.text(str)
	s.WriteString("</bdi>")
}

// rightToLeft says whether s has a letter of a script that is written from right to left.
func rightToLeft(s string) bool {
	for _, r := range s {
		switch {
		case r < 0x0590:
		case r <= 0x08FF, r >= 0xFB1D && r <= 0xFDFF, r >= 0xFE70 && r <= 0xFEFF, r >= 0x10800 && r <= 0x10FFF, r >= 0x1E800 && r <= 0x1EFFF:
			if unicode.IsLetter(r) {
				return true
			}
		}
	}
	return false
}

// spans writes prose with its styles.
func (s *hypertext) spans(spans []span) {
	for _, x := range spans {
		open, shut := "", ""
		for _, t := range []struct {
			style style
			tag   string
		}{{strong, "strong"}, {emphasis, "em"}, {code, "code"}} {
			if x.style&t.style != 0 {
				open += "<" + t.tag + ">"
				shut = "</" + t.tag + ">" + shut
			}
		}
		s.WriteString(open)
		if x.data {
			s.isolate(x.text)
		} else {
			s.text(x.text)
		}
		s.WriteString(shut)
	}
}
