package page

import (
	"fmt"
	"strings"

	"ringbook/snubber/quantity"
)

// grid is a table as strings, before any output's own escaping: what the outputs
// for people have in common.
type grid struct {
	title   string
	columns []gridColumn
	rows    [][]string
	notes   []note
}

type gridColumn struct {
	head     string
	align    align
	flexible bool   // may be wrapped and cut
	label    bool   // may be cut, at a generous width
	marks    bool   // holds the marks of footnotes
	quantity bool   // holds values with their units
	unit     string // the symbol that ends the head, or ""
}

type note struct {
	mark  string // "" for a note on the whole table
	spans []span
}

type align uint8

const (
	left align = iota
	right
	decimal // on the decimal point where the output can, else right
)

const (
	dash  = "–"        // an empty cell
	slash = " /\u00a0" // between a quantity and its unit in a head (SI Brochure, 9th edition, 5.4.1)
)

// grid gives the table's strings.
func (t *Table) grid() (*grid, error) {
	if err := t.check(); err != nil {
		return nil, err
	}
	g := &grid{title: t.title, columns: make([]gridColumn, len(t.columns)), rows: make([][]string, len(t.rows))}
	for i := range g.rows {
		g.rows[i] = make([]string, len(t.columns), len(t.columns)+1)
	}
	cells := make([]cell, len(t.rows))
	for j, c := range t.columns {
		t.column(j, cells)
		gc, format := c.layout(cells)
		g.columns[j] = gc
		for i, x := range cells {
			if x.full {
				g.rows[i][j] = format(x)
			} else {
				g.rows[i][j] = dash
			}
		}
	}
	t.addNotes(g)
	return g, nil
}

// layout gives a column's head and the format of its cells, both from what all its cells hold.
func (c Column) layout(all []cell) (gridColumn, func(cell) string) {
	gc := gridColumn{head: plain(c.head)}
	switch c.kind {
	case words:
		gc.flexible = true
		return gc, func(x cell) string { return x.text }
	case label:
		gc.label = true
		return gc, func(x cell) string { return x.text }
	case instant:
		suffix, format := instants(all)
		gc.head += suffix
		return gc, func(x cell) string { return x.at.Format(format) }
	}
	var cells []cell
	var values []float64
	for _, x := range all {
		if x.full {
			cells = append(cells, x)
			values = append(values, x.value)
		}
	}
	gc.align = right
	if c.kind == part {
		return gc, func(x cell) string {
			return strings.ReplaceAll(quantity.Code(x.value, c.unit), " ", "\u00a0")
		}
	}
	s := scaleOf(c.unit, cells...)
	if c.kind == fraction {
		s = percent
	}
	if s.symbol != "" {
		gc.head += slash + s.symbol
		gc.unit = s.symbol
	}
	switch c.kind {
	case interval:
		return gc, func(x cell) string {
			if !x.bounded() {
				return dash
			}
			return s.interval(x, false)
		}
	case measured:
		gc.align = decimal
		return gc, s.measured
	}
	gc.align = decimal
	format := s.alike(values)
	return gc, func(x cell) string { return format(x.value) }
}

// instants gives what to add to the head of a column of times and the format of its cells: the zone stands
// in the head when all share it, else in every cell. Seconds are shown when one cell has them.
func instants(cells []cell) (suffix, format string) {
	const date, zone = "2006-01-02 15:04", "Z07:00"
	format = date
	offsets := map[string]bool{}
	for _, x := range cells {
		if !x.full {
			continue
		}
		offsets[x.at.Format(zone)] = true
		if x.at.Second() != 0 {
			format = date + ":05"
		}
	}
	if len(offsets) != 1 {
		return "", format + zone
	}
	for o := range offsets {
		if o == "Z" {
			return " (UTC)", format
		}
		suffix = " (UTC" + o + ")"
	}
	return suffix, format
}

// addNotes gives each distinct row note a letter and marks its rows in a last column of their own, where a
// mark cannot be read as part of a number.
func (t *Table) addNotes(g *grid) {
	letters := map[string]string{}
	for i, r := range t.rows {
		var marks []string
		for _, n := range r.notes {
			key := fmt.Sprint(n)
			if letters[key] == "" {
				letters[key] = letter(len(letters))
				g.notes = append(g.notes, note{letters[key], n})
			}
			marks = append(marks, letters[key])
		}
		g.rows[i] = append(g.rows[i], strings.Join(marks, " "))
	}
	g.columns = append(g.columns, gridColumn{marks: true})
	if len(letters) == 0 {
		g.drop(len(g.columns) - 1)
	}
	for _, n := range t.notes {
		g.notes = append(g.notes, note{"", n})
	}
}

// drop takes column j out.
func (g *grid) drop(j int) {
	g.columns = append(g.columns[:j:j], g.columns[j+1:]...)
	for i, row := range g.rows {
		g.rows[i] = append(row[:j:j], row[j+1:]...)
	}
}
