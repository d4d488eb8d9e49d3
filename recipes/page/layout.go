package page

import (
	"strings"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"
)

const (
	gap      = 2  // columns of the terminal between columns of a table
	maxLabel = 38 // columns a label may take, and no more than half the terminal: two fit side by side
	minWords = 12 // columns a prose column is not squeezed below
	maxLines = 3  // lines of a prose cell
)

// grid writes a table for the terminal.
func (t *terminal) grid(g *grid) {
	if g.title != "" {
		for _, l := range wrap(g.title, t.width) {
			t.line(t.strong(l))
		}
		t.line("")
	}
	prepare(g, t.width)
	for i, panel := range panels(g, t.width) {
		if i > 0 {
			t.line("")
		}
		t.panel(g, panel)
	}
	if len(g.rows) == 0 {
		t.line("no rows")
	}
	if len(g.notes) > 0 {
		t.line("")
	}
	for _, n := range g.notes {
		lead := ""
		if n.mark != "" {
			lead = n.mark + "  "
		}
		t.hang(lead, lead, flat(n.spans))
	}
}

// prepare cuts labels and lines numbers up on the decimal point.
func prepare(g *grid, total int) {
	for j, c := range g.columns {
		if c.label {
			most := min(maxLabel, (total-gap)/2)
			if c.align == decimal { // a key figure's value: cut only what can be no number
				most = maxLabel
			}
			for _, row := range g.rows {
				row[j] = cut(row[j], most)
			}
		}
		if c.align == decimal {
			lineUp(g.rows, j)
		}
	}
}

// lineUp pads column j so that its decimal points stand under each other and all cells are as wide.
func lineUp(rows [][]string, j int) {
	before, all := 0, 0
	for _, row := range rows {
		before = max(before, width(row[j][:point(row[j])]))
	}
	for _, row := range rows {
		row[j] = strings.Repeat(" ", before-width(row[j][:point(row[j])])) + row[j]
		all = max(all, width(row[j]))
	}
	for _, row := range rows {
		row[j] += strings.Repeat(" ", all-width(row[j]))
	}
}

// point is where the decimal point of a number stands, or would stand: after the first run of digits. For
// what is no number it is the end.
func point(s string) int {
	digits := false
	for i, r := range s {
		if r >= '0' && r <= '9' {
			digits = true
		} else if digits {
			return i
		}
	}
	return len(s)
}

// widths are the columns' natural widths (as wide as their widest cell or head) and least widths (heads
// wrapped, prose squeezed).
func widths(g *grid) (natural, least []int) {
	natural, least = make([]int, len(g.columns)), make([]int, len(g.columns))
	for j, c := range g.columns {
		cells := 0
		for _, row := range g.rows {
			cells = max(cells, width(row[j]))
		}
		word := 0
		for w := range strings.SplitSeq(c.head, " ") {
			word = max(word, width(w))
		}
		natural[j] = max(cells, width(c.head))
		least[j] = max(cells, word)
		if c.flexible {
			least[j] = max(min(cells, minWords), word)
		}
	}
	return natural, least
}

// panel is some of a table's columns and the width each gets.
type panel struct{ columns, widths []int }

// panels shares the terminal's width out: one panel when the table fits, else as many as it needs, each
// beginning with the first column.
func panels(g *grid, total int) []panel {
	natural, least := widths(g)
	var out []panel
	cols := []int{0}
	used := least[0]
	for j := 1; j < len(g.columns); j++ {
		if used+gap+least[j] > total && len(cols) > 1 {
			out = append(out, share(g, cols, natural, least, total))
			cols, used = []int{0}, least[0]
		}
		cols = append(cols, j)
		used += gap + least[j]
	}
	return append(out, share(g, cols, natural, least, total))
}

// share gives every column its natural width where that fits, else its least width, and lets the prose
// columns grow into what is left, the narrowest first.
func share(g *grid, cols, natural, least []int, total int) panel {
	p := panel{columns: cols, widths: make([]int, len(cols))}
	spare := total - gap*(len(cols)-1)
	for i, j := range cols {
		p.widths[i] = natural[j]
		spare -= natural[j]
	}
	if spare >= 0 {
		return p
	}
	for i, j := range cols {
		p.widths[i] = least[j]
		spare += natural[j] - least[j]
	}
	for grew := true; grew && spare > 0; {
		grew = false
		for i, j := range cols {
			if g.columns[j].flexible && p.widths[i] < natural[j] && spare > 0 {
				p.widths[i]++
				spare--
				grew = true
			}
		}
	}
	return p
}

// panel draws one panel through go-pretty.
func (t *terminal) panel(g *grid, p panel) {
	w := table.NewWriter()
	w.SetStyle(quiet())
	var configs []table.ColumnConfig
	var head table.Row
	for i, j := range p.columns {
		c := g.columns[j]
		cfg := table.ColumnConfig{Number: i + 1, WidthMin: p.widths[i], VAlignHeader: text.VAlignBottom}
		if c.align != left {
			cfg.Align, cfg.AlignHeader = text.AlignRight, text.AlignRight
		}
		configs = append(configs, cfg)
		lines := wrap(c.head, p.widths[i])
		for k := range lines {
			lines[k] = t.strong(lines[k])
		}
		head = append(head, strings.Join(lines, "\n"))
	}
	w.SetColumnConfigs(configs)
	w.AppendHeader(head)
	for _, row := range g.rows {
		cells := make(table.Row, len(p.columns))
		for i, j := range p.columns {
			cells[i] = row[j]
			if g.columns[j].flexible {
				cells[i] = clip(row[j], p.widths[i])
			}
		}
		w.AppendRow(cells)
	}
	for l := range strings.SplitSeq(w.Render(), "\n") {
		t.line(l)
	}
}

// clip wraps prose and cuts it after maxLines.
func clip(s string, n int) string {
	lines := wrap(s, n)
	if len(lines) > maxLines {
		lines = lines[:maxLines]
		lines[maxLines-1] = cut(lines[maxLines-1]+strings.Repeat(" ", n), n)
	}
	return strings.Join(lines, "\n")
}

// quiet is our style: a thin rule under the head, no box, gaps instead of lines.
func quiet() table.Style {
	return table.Style{
		Name: "quiet",
		Box: table.BoxStyle{
			MiddleHorizontal: "─", MiddleSeparator: "──", MiddleVertical: "  ",
			LeftSeparator: "", RightSeparator: "", EmptySeparator: "  ",
		},
		Options: table.Options{SeparateColumns: true, SeparateHeader: true},
	}
}
