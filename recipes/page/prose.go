package page

import (
	"fmt"
	"go/ast"
	"strings"

	"github.com/yuin/goldmark/parser"
	"github.com/yuin/goldmark/text"
	"github.com/yuin/goldmark/util"

	mark "github.com/yuin/goldmark/ast"
)

// prose is a recipe's comment as Markdown, and listing a piece of its code.
type (
	prose   struct{ source string }
	listing struct {
		file        string
		first, last int
		lines       []string
		unreached   bool // what follows the statement that failed
	}
)

func (prose) csv() ([][]string, error)    { return nil, nil }
func (*listing) csv() ([][]string, error) { return nil, nil }

// markdownOf is the text of a comment: without its marks, without directives to tools, and of a comment between /* and
// */ without the indentation that its lines share. Control characters are made visible.
func markdownOf(group *ast.CommentGroup) string {
	if group == nil {
		return ""
	}
	var parts []string
	lines := &ast.CommentGroup{}
	flush := func() {
		if s := lines.Text(); s != "" {
			parts = append(parts, s)
		}
		lines = &ast.CommentGroup{}
	}
	for _, c := range group.List {
		if inner, ok := strings.CutPrefix(c.Text, "/*"); ok {
			flush()
			parts = append(parts, dedent(strings.TrimSuffix(inner, "*/")))
			continue
		}
		lines.List = append(lines.List, c)
	}
	flush()
	shown := strings.Split(strings.Trim(strings.Join(parts, "\n"), "\n"), "\n")
	for i, l := range shown {
		shown[i] = strings.TrimRight(plain(strings.ReplaceAll(l, "\t", "    ")), " ")
	}
	return strings.TrimRight(strings.Join(shown, "\n"), "\n ")
}

// dedent takes off the indentation that all lines but the first share; the first stands behind the comment's mark.
func dedent(s string) string {
	lines := strings.Split(s, "\n")
	lines[0] = strings.TrimLeft(lines[0], " \t")
	shared := ""
	for i, l := range lines[1:] {
		l = strings.TrimRight(l, " \t\r")
		lines[i+1] = l
		own := l[:len(l)-len(strings.TrimLeft(l, " \t"))]
		switch {
		case l == "":
		case shared == "":
			shared = own
		default:
			for !strings.HasPrefix(own, shared) {
				shared = shared[:len(shared)-1]
			}
		}
	}
	for i, l := range lines[1:] {
		lines[i+1] = strings.TrimPrefix(l, shared)
	}
	return strings.TrimSpace(strings.Join(lines, "\n"))
}

// proseParser reads CommonMark except raw HTML, which stays text.
func proseParser() parser.Parser {
	return parser.NewParser(
		parser.WithBlockParsers(
			util.Prioritized(parser.NewSetextHeadingParser(), 100),
			util.Prioritized(parser.NewThematicBreakParser(), 200),
			util.Prioritized(parser.NewListParser(), 300),
			util.Prioritized(parser.NewListItemParser(), 400),
			util.Prioritized(parser.NewCodeBlockParser(), 500),
			util.Prioritized(parser.NewATXHeadingParser(), 600),
			util.Prioritized(parser.NewFencedCodeBlockParser(), 700),
			util.Prioritized(parser.NewBlockquoteParser(), 800),
			util.Prioritized(parser.NewParagraphParser(), 1000),
		),
		parser.WithInlineParsers(
			util.Prioritized(parser.NewCodeSpanParser(), 100),
			util.Prioritized(parser.NewLinkParser(), 200),
			util.Prioritized(parser.NewAutoLinkParser(), 300),
			util.Prioritized(parser.NewEmphasisParser(), 500),
		),
		parser.WithParagraphTransformers(util.Prioritized(parser.LinkReferenceParagraphTransformer, 100)),
	)
}

// parse gives the prose as a tree: its headings one level down, since the page's title is the first, and its images,
// which would have to be fetched, as their text.
func (p prose) parse() (mark.Node, []byte) {
	src := []byte(p.source)
	doc := proseParser().Parse(text.NewReader(src))
	var images []mark.Node
	_ = mark.Walk(doc, func(n mark.Node, entering bool) (mark.WalkStatus, error) {
		switch n := n.(type) {
		case *mark.Heading:
			if entering {
				n.Level = min(n.Level+1, 6)
			}
		case *mark.Image:
			if !entering { // inner ones first
				images = append(images, n)
			}
		}
		return mark.WalkContinue, nil
	})
	for _, n := range images {
		for c := n.FirstChild(); c != nil; c = n.FirstChild() {
			n.Parent().InsertBefore(n.Parent(), n, c)
		}
		n.Parent().RemoveChild(n.Parent(), n)
	}
	return doc, src
}

// rows are the lines of a code block.
func rows(n mark.Node, src []byte) []string {
	var out []string
	for i := range n.Lines().Len() {
		at := n.Lines().At(i)
		out = append(out, strings.TrimRight(string(at.Value(src)), "\n"))
	}
	return out
}

// inlines are the pieces of a paragraph in order. Links are followed by their address where it says more than their
// text; an image is its text. A hard line break is a span of "\n".
func inlines(n mark.Node, src []byte, st style) []span {
	var out []span
	for c := n.FirstChild(); c != nil; c = c.NextSibling() {
		switch c := c.(type) {
		case *mark.Text:
			b := c.Segment.Value(src)
			if st&code == 0 && !c.IsRaw() {
				b = util.ResolveEntityNames(util.ResolveNumericReferences(util.UnescapePunctuations(b)))
			}
			out = append(out, span{text: string(b), style: st})
			switch {
			case c.HardLineBreak():
				out = append(out, span{text: "\n"})
			case c.SoftLineBreak():
				out = append(out, span{text: " ", style: st})
			}
		case *mark.String:
			out = append(out, span{text: string(c.Value), style: st})
		case *mark.CodeSpan:
			out = append(out, inlines(c, src, st|code)...)
		case *mark.Emphasis:
			further := emphasis
			if c.Level == 2 {
				further = strong
			}
			out = append(out, inlines(c, src, st|further)...)
		case *mark.Link:
			inner := inlines(c, src, st)
			out = append(out, inner...)
			if to := string(c.Destination); to != flat(inner) && to != "" {
				out = append(out, span{text: " (" + to + ")", style: st})
			}
		case *mark.AutoLink:
			out = append(out, span{text: string(c.Label(src)), style: st})
		default:
			out = append(out, inlines(c, src, st)...)
		}
	}
	return out
}

// caption says which lines a listing is.
func (l *listing) caption() string {
	at := fmt.Sprintf("%s, lines %d to %d", l.file, l.first, l.last)
	if l.first == l.last {
		at = fmt.Sprintf("%s, line %d", l.file, l.first)
	}
	if l.unreached {
		return "The rest of the recipe, which gave nothing: " + at
	}
	return "Code: " + at
}
