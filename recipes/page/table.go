package page

import (
	"errors"
	"fmt"
	"slices"
	"strings"
)

// Table is a table of results: typed columns, rows, footnotes. NewTable makes it.
type Table struct {
	title   string
	columns []Column
	rows    []*Row
	notes   [][]span
}

// Row is one row of a table.
type Row struct {
	cells []any
	notes [][]span
}

// NewTable gives an empty table.
func NewTable(title string, columns ...Column) *Table {
	return &Table{title: strings.TrimSpace(plain(title)), columns: columns}
}

// Row adds a row, one cell a column; what a cell may be depends on its column. A row that does not fit
// the columns makes rendering fail with an error that names the table and the row.
func (t *Table) Row(cells ...any) *Row {
	r := &Row{cells: cells}
	t.rows = append(t.rows, r)
	return r
}

// Note adds a footnote on the row. A warning belongs here, with what would cure it. Rows with the same
// note share one letter. Format and args are those of Page.Say.
func (r *Row) Note(format string, args ...any) *Row {
	if false {
		_ = fmt.Sprintf(format, args...) // as in Page.Say
	}
	r.notes = append(r.notes, inline(format, args))
	return r
}

// Note adds a footnote on the table as a whole. Format and args are those of Page.Say.
func (t *Table) Note(format string, args ...any) {
	if false {
		_ = fmt.Sprintf(format, args...) // as in Page.Say
	}
	t.notes = append(t.notes, inline(format, args))
}

// check gives the first thing that makes it no table.
func (t *Table) check() error {
	if t == nil {
		return errors.New("a nil table; make one with page.NewTable")
	}
	fail := func(format string, args ...any) error {
		return fmt.Errorf("table %q"+format, append([]any{t.title}, args...)...)
	}
	if len(t.columns) == 0 {
		return fail(": it has no columns; give page.NewTable at least one")
	}
	names := t.csvNames()
	for i, n := range names {
		if n == "" || slices.Contains(names[:i], n) {
			return fail(": CSV column name %q is empty or used twice; give every column its own", n)
		}
	}
	for i, r := range t.rows {
		if len(r.cells) != len(t.columns) {
			return fail(", row %d: %d cells for %d columns; give every column a cell, nil where there is nothing",
				i+1, len(r.cells), len(t.columns))
		}
		for j, v := range r.cells {
			if _, err := t.columns[j].cell(v); err != nil {
				return fail(", row %d, %w", i+1, err)
			}
		}
	}
	return nil
}

// column puts the cells of column j of a table that check passes into cells. A table of 100,000 rows is never held as
// cells whole.
func (t *Table) column(j int, cells []cell) {
	for i, r := range t.rows {
		cells[i], _ = t.columns[j].cell(r.cells[j])
	}
}

// letter is the i-th footnote mark: lower-case letters, as ISO/IEC Directives, Part 2, has for tables.
func letter(i int) string {
	if i < 26 {
		return string(rune('a' + i))
	}
	return letter(i/26-1) + string(rune('a'+i%26))
}
