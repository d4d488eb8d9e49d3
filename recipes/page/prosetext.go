package page

import (
	"strconv"
	"strings"

	"github.com/yuin/goldmark/ast"
)

// text writes prose wrapped to the width: headings bold, lists hanging, code blocks and quotations indented.
func (p prose) text(t *terminal) error {
	doc, src := p.parse()
	t.blocks(doc, src, "", "")
	return nil
}

// blocks writes the blocks inside n, the first line of them after lead, all others after indent. In a tight list no
// line is left empty between them.
func (t *terminal) blocks(n ast.Node, src []byte, lead, indent string) {
	for c := n.FirstChild(); c != nil; c = c.NextSibling() {
		if c.PreviousSibling() != nil && c.Kind() != ast.KindTextBlock && !tightItem(c) && !(c.Kind() == ast.KindList && c.PreviousSibling().Kind() == ast.KindTextBlock) {
			t.line("")
		}
		switch c := c.(type) {
		case *ast.Heading:
			t.paragraph(inlines(c, src, 0), lead, indent, t.strong)
		case *ast.List:
			number := c.Start
			for item := c.FirstChild(); item != nil; item = item.NextSibling() {
				mark := "- "
				if c.IsOrdered() {
					mark = strconv.Itoa(number) + ". "
					number++
				}
				if item.PreviousSibling() != nil && !c.IsTight {
					t.line("")
				}
				t.blocks(item, src, lead+mark, indent+strings.Repeat(" ", len(mark)))
				lead = indent
			}
		case *ast.FencedCodeBlock, *ast.CodeBlock:
			for _, l := range rows(c, src) {
				t.line(lead + "    " + l)
				lead = indent
			}
		case *ast.Blockquote:
			t.blocks(c, src, lead+"  ", indent+"  ")
		case *ast.ThematicBreak:
			t.line(lead + strings.Repeat("─", 20))
		default:
			t.paragraph(inlines(c, src, 0), lead, indent, func(s string) string { return s })
		}
		lead = indent
	}
}

func tightItem(n ast.Node) bool { return n.Kind() == ast.KindListItem }

// paragraph wraps spans.
func (t *terminal) paragraph(spans []span, lead, indent string, paint func(string) string) {
	for part := range strings.SplitSeq(flat(spans), "\n") {
		for _, l := range wrap(part, max(t.width-width(indent), 20)) {
			t.line(lead + paint(l))
			lead = indent
		}
	}
}

// text writes code where it was asked for, not wrapped: a line cut in two is no Go.
func (l *listing) text(t *terminal) error {
	if !t.code {
		return nil
	}
	if l.unreached {
		t.line(l.caption() + ":")
	}
	for _, s := range l.lines {
		t.line("    " + s)
	}
	return nil
}

func (f *failure) text(t *terminal) error {
	t.hang("Error: ", t.strong("Error:")+" ", f.message)
	return nil
}
