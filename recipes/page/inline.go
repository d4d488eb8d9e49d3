package page

import (
	"fmt"
	"strings"
	"sync"
	"unicode/utf8"

	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/parser"
	"github.com/yuin/goldmark/text"
	"github.com/yuin/goldmark/util"
)

// style is how a span of text stands out.
type style uint8

const (
	strong style = 1 << iota
	emphasis
	code
)

// span is a piece of prose in one style. Prose is kept as spans, not as Markdown, so that each output
// escapes the text in its own way and data cannot become markup in any of them.
type span struct {
	text  string
	style style
	data  bool // came as an argument
}

// Arguments stand in the format as one private-use rune each (plane 15, so no keyboard and no instrument
// writes them) while goldmark reads the markup, and are put in afterwards.
const (
	firstMark = '\U000F0000'
	lastMark  = '\U000FFFFD'
)

// inlineParser reads a paragraph with code spans and emphasis and takes everything else (headings, lists,
// links, raw HTML) as text. Making it costs more than a sentence does, so there is one; it keeps nothing of what it read.
var inlineParser = sync.OnceValue(func() parser.Parser {
	return parser.NewParser(
		parser.WithBlockParsers(util.Prioritized(parser.NewParagraphParser(), 1)),
		parser.WithInlineParsers(
			util.Prioritized(parser.NewCodeSpanParser(), 1),
			util.Prioritized(parser.NewEmphasisParser(), 2),
		))
})

// inline formats args into format and splits the result into spans.
func inline(format string, args []any) []span {
	format = strings.Map(func(r rune) rune {
		if r >= firstMark && r <= lastMark {
			return '\uFFFD'
		}
		return r
	}, format)
	var data []string
	wrapped := make([]any, len(args))
	for i, a := range args {
		wrapped[i] = argument{a, &data}
	}
	src := []byte(strings.TrimSpace(plain(fmt.Sprintf(format, wrapped...))))

	var spans []span
	add := func(s string, st style, isData bool) {
		if s != "" {
			spans = append(spans, span{s, st, isData})
		}
	}
	put := func(s string, st style) {
		from := 0
		for at, r := range s {
			if i := int(r - firstMark); r >= firstMark && i < len(data) {
				add(s[from:at], st, false)
				add(data[i], st, true)
				from = at + utf8.RuneLen(r)
			}
		}
		add(s[from:], st, false)
	}

	var walk func(ast.Node, style)
	walk = func(n ast.Node, st style) {
		for c := n.FirstChild(); c != nil; c = c.NextSibling() {
			switch c := c.(type) {
			case *ast.Text:
				b := c.Segment.Value(src)
				if st&code == 0 {
					b = util.UnescapePunctuations(b)
				}
				put(string(b), st)
			case *ast.Emphasis:
				if c.Level == 2 {
					walk(c, st|strong)
				} else {
					walk(c, st|emphasis)
				}
			case *ast.CodeSpan:
				walk(c, st|code)
			default:
				walk(c, st)
			}
		}
	}
	walk(inlineParser().Parse(text.NewReader(src)), 0)
	return spans
}

// argument formats its value as fmt would, keeps the outcome in data and writes its mark.
type argument struct {
	value any
	data  *[]string
}

// Format implements fmt.Formatter.
func (a argument) Format(s fmt.State, verb rune) {
	mark := firstMark + rune(len(*a.data))
	if mark > lastMark {
		return // 65,000 arguments in one sentence
	}
	*a.data = append(*a.data, plain(fmt.Sprintf(fmt.FormatString(s, verb), a.value)))
	_, _ = fmt.Fprint(s, string(mark)) // a fmt.State cannot fail
}

// merge joins neighbours of one style, for the outputs in which what stands beside a character matters.
func merge(spans []span) []span {
	var out []span
	for _, s := range spans {
		if n := len(out); n > 0 && out[n-1].style == s.style {
			out[n-1].text += s.text
			continue
		}
		out = append(out, s)
	}
	return out
}

// flat is the text of the spans without their styles.
func flat(spans []span) string {
	var b strings.Builder
	for _, s := range spans {
		b.WriteString(s.text)
	}
	return b.String()
}
