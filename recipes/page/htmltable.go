package page

import (
	"strconv"
	"strings"
)

const (
	longTable = 24  // rows from which a table may be cut between pages
	longWord  = 38  // characters from which a cell's text may be broken anywhere
	printed   = 100 // characters of the printed line at the size of a table's text
)

// grid writes a table, its caption above and its footnotes below.
func (s *hypertext) grid(g *grid) {
	s.tables++
	id := "table-" + strconv.Itoa(s.tables)
	s.WriteString("<section class=\"table" + g.classes() + "\">\n<div class=\"scroll\" role=\"region\" tabindex=\"0\" aria-labelledby=\"" + id +
		"\">\n<table>\n<caption id=\"" + id + "\"><span><b>Table ")
	s.WriteString(strconv.Itoa(s.tables))
	s.WriteString("</b> ")
	s.isolate(g.title)
	s.WriteString("</span></caption>\n<thead><tr>")
	cells := make([]htmlCell, len(g.columns))
	for j, c := range g.columns {
		cells[j] = g.htmlCell(j)
		s.WriteString("<th scope=\"col\"" + class(cells[j].class) + ">")
		if cells[j].marks {
			s.WriteString("<span class=\"unseen\">Footnote</span>")
		} else {
			s.isolate(unbroken(c.head))
		}
		s.WriteString("</th>")
	}
	s.WriteString("</tr></thead>\n<tbody>\n")
	s.Grow(g.bytes())
	for _, row := range g.rows {
		s.WriteString("<tr>")
		for j, x := range row {
			s.cell(&cells[j], id, x)
		}
		s.WriteString("</tr>\n")
	}
	if len(g.rows) == 0 {
		s.WriteString("<tr><td colspan=\"" + strconv.Itoa(len(g.columns)) + "\">no rows</td></tr>\n")
	}
	s.WriteString("</tbody>\n</table>\n</div>\n")
	for _, n := range g.notes {
		s.WriteString("<p class=\"note\"")
		if n.mark != "" {
			s.WriteString(" id=\"" + id + "-" + n.mark + "\"><b>" + n.mark + "</b> ")
		} else {
			s.WriteString(">")
		}
		s.spans(n.spans)
		s.WriteString("</p>\n")
	}
	s.WriteString("</section>\n")
}

// bytes is about how long the rows are as HTML, so that memory for a long table is taken once.
func (g *grid) bytes() int {
	n := 0
	for _, row := range g.rows {
		n += 10
		for _, x := range row {
			n += len(x) + 20
		}
	}
	return n
}

// unbroken keeps a short head in one line.
func unbroken(head string) string {
	if len(head) > 14 {
		return head
	}
	return strings.ReplaceAll(head, " ", "\u00a0")
}

// htmlCell is what the cells of a column have in common.
type htmlCell struct {
	class string
	start string // <td> or <th scope=row>, with its class
	end   string
	marks bool   // the column of footnote marks
	most  suffix // of a column on the decimal point
	align align
}

func (g *grid) htmlCell(j int) htmlCell {
	c := g.columns[j]
	h := htmlCell{align: c.align, marks: c.marks}
	longest := 0
	for _, row := range g.rows {
		longest = max(longest, len(row[j]))
		if c.align == decimal {
			h.most.widen(suffixOf(row[j]))
		}
	}
	switch {
	case c.align != left:
		h.class = "n"
	case longest > longWord:
		h.class = "w"
	}
	h.start, h.end = "<td"+class(h.class)+">", "</td>"
	if j == 0 && (c.label || c.flexible) {
		h.start, h.end = "<th scope=\"row\""+class(h.class)+">", "</th>"
	}
	return h
}

func class(name string) string {
	if name == "" {
		return ""
	}
	return " class=\"" + name + "\""
}

// cell writes one cell. Its decimal point is brought under the others' by what the style sheet writes invisibly after
// it: the text itself has no filling, so that a number can be copied and searched for.
func (s *hypertext) cell(h *htmlCell, table, x string) {
	if h.align == decimal {
		if pad := h.most.missing(suffixOf(x)); pad != "" {
			s.WriteString(h.start[:len(h.start)-1])
			s.WriteString(" data-pad=\"" + pad + "\">")
			s.text(x)
			s.WriteString(h.end)
			return
		}
	}
	s.WriteString(h.start)
	switch {
	case h.marks:
		for i, m := range strings.Fields(x) {
			if i > 0 {
				s.WriteByte(' ')
			}
			s.WriteString("<a href=\"#" + table + "-" + m + "\">" + m + "</a>")
		}
	default:
		s.isolate(x)
	}
	s.WriteString(h.end)
}

// classes say how a table prints: in one piece if it is short, in smaller type if it is wide.
func (g *grid) classes() string {
	classes := ""
	if len(g.rows) < longTable {
		classes = " short"
	}
	switch wide := g.measure(); {
	case wide > printed*3/2:
		classes += " tiny"
	case wide > printed*5/4:
		classes += " smaller"
	case wide > printed:
		classes += " small"
	}
	return classes
}

// measure is about how many characters a row takes when prose is wrapped.
func (g *grid) measure() int {
	total := 0
	for j, c := range g.columns {
		most := 0
		for word := range strings.SplitSeq(c.head, " ") {
			most = max(most, len([]rune(word)))
		}
		for _, row := range g.rows {
			n := len(row[j])
			if c.align == left && n > longWord {
				n = longWord / 2
			}
			most = max(most, n)
		}
		total += most + 2
	}
	return total
}
