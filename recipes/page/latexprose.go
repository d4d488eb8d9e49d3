package page

import (
	"strconv"

	"github.com/yuin/goldmark/ast"
)

func (p prose) latex(d *document) error {
	doc, src := p.parse()
	d.blocks(doc, src)
	return nil
}

// blocks writes the blocks inside n.
func (d *document) blocks(n ast.Node, src []byte) {
	for c := n.FirstChild(); c != nil; c = c.NextSibling() {
		if c.PreviousSibling() != nil {
			d.WriteByte('\n')
		}
		switch c := c.(type) {
		case *ast.Heading:
			command := "subsubsection"
			if c.Level <= 2 {
				command = "section"
			} else if c.Level == 3 {
				command = "subsection"
			}
			d.WriteString("\\" + command + "*{" + latexSpans(inlines(c, src, 0)) + "}\n")
		case *ast.List:
			d.WriteString("\\begin{itemize}\n")
			number := c.Start
			for item := c.FirstChild(); item != nil; item = item.NextSibling() {
				d.WriteString("\\item")
				if c.IsOrdered() {
					d.WriteString("[" + strconv.Itoa(number) + ".]")
					number++
				}
				d.WriteByte(' ')
				d.blocks(item, src)
			}
			d.WriteString("\\end{itemize}\n")
		case *ast.FencedCodeBlock, *ast.CodeBlock:
			d.code(rows(c, src))
		case *ast.Blockquote:
			d.WriteString("\\begin{quote}\n")
			d.blocks(c, src)
			d.WriteString("\\end{quote}\n")
		case *ast.ThematicBreak:
			d.WriteString("\\par\\noindent\\rule{\\linewidth}{0.4pt}\n")
		default:
			d.WriteString(latexSpans(inlines(c, src, 0)) + "\n")
		}
	}
}

// code writes lines of code, none of them as verbatim text, which they could end.
func (d *document) code(lines []string) {
	d.WriteString("\\begin{flushleft}\\footnotesize\\ttfamily\n")
	for i, l := range lines {
		if l == "" {
			l = " "
		}
		d.WriteString("\\mbox{}" + latexCode(l))
		if i < len(lines)-1 {
			d.WriteString(`\\`)
		}
		d.WriteByte('\n')
	}
	d.WriteString("\\end{flushleft}\n")
}

func (l *listing) latex(d *document) error {
	if l.unreached {
		d.WriteString(escapeLaTeX(l.caption()) + ":\n\n")
	}
	d.code(l.lines)
	return nil
}
