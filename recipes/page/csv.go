package page

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"io"
	"strconv"
	"time"
)

// CSV writes the page's tables and key figures for a spreadsheet or a script: comma-separated, a header
// row each (RFC 4180, but with LF line ends as encoding/csv has them), values unscaled in SI units. Tables
// after the first are set off by an empty line. Text that a spreadsheet would take for a formula gets a
// leading apostrophe; numbers never do. Nothing is written when there is an error.
func (p *Page) CSV(w io.Writer) error {
	var buf bytes.Buffer
	for _, b := range p.results() {
		records, err := b.csv()
		if err != nil {
			return fmt.Errorf("page %q as CSV: %w", p.title, err)
		}
		if records == nil {
			continue
		}
		if buf.Len() > 0 {
			buf.WriteByte('\n')
		}
		if err := csv.NewWriter(&buf).WriteAll(records); err != nil {
			return fmt.Errorf("page %q as CSV: %w", p.title, err)
		}
	}
	if _, err := w.Write(buf.Bytes()); err != nil {
		return fmt.Errorf("page %q as CSV: %w", p.title, err)
	}
	return nil
}

// csvNames are the names in the header row.
func (t *Table) csvNames() []string {
	var names []string
	for _, c := range t.columns {
		switch c.kind {
		case measured:
			names = append(names, c.csv, c.csv+"_u")
		case interval:
			names = append(names, c.csv+"_low", c.csv+"_high")
		default:
			names = append(names, c.csv)
		}
	}
	return names
}

func (t *Table) csv() ([][]string, error) {
	if err := t.check(); err != nil {
		return nil, err
	}
	records := make([][]string, 0, len(t.rows)+1)
	records = append(records, t.csvNames())
	for _, row := range t.rows {
		record := make([]string, 0, len(records[0]))
		for j, v := range row.cells {
			x, _ := t.columns[j].cell(v)
			record = x.appendCSV(record, t.columns[j].kind)
		}
		records = append(records, record)
	}
	return records, nil
}

// appendCSV appends the cell's fields.
func (x cell) appendCSV(record []string, k kind) []string {
	switch {
	case k == measured && !x.full, k == interval && !x.full:
		return append(record, "", "")
	case !x.full:
		return append(record, "")
	}
	switch k {
	case words, label:
		return append(record, guardCSV(x.text))
	case instant:
		return append(record, x.at.Format(time.RFC3339Nano))
	case measured:
		u := ""
		if x.u != 0 {
			u = csvNumber(x.u)
		}
		return append(record, csvNumber(x.value), u)
	case interval:
		if !x.bounded() {
			return append(record, "", "")
		}
		return append(record, csvNumber(x.low), csvNumber(x.high))
	}
	return append(record, csvNumber(x.value))
}

// csvNumber is the shortest text that reads back as v. A value that is no number (NaN, +Inf, -Inf) is
// written so, not hidden.
func csvNumber(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
