package page

import (
	"fmt"

	"ringbook/snubber/quantity"
)

// Figure is one key figure: a quantity the reader came for.
type Figure struct {
	Name   string // in words, such as "loop inductance"
	CSV    string // its name in CSV, with the unit, such as inductance_h
	Unit   quantity.Unit
	Value  any    // as a cell of a Measured column, or a short string; nil: the trials cannot tell
	Remark string // one short remark, or ""
}

// keyFigures is the caption of figures where a table must have one.
const keyFigures = "Key figures"

// figureList is the figures of one Page.Figures call.
type figureList []Figure

// cells checks the figures' values: a string becomes text, all else must be a number.
func (fs figureList) cells() ([]cell, error) {
	cells := make([]cell, len(fs))
	for i, f := range fs {
		if s, ok := f.Value.(string); ok {
			cells[i] = cell{full: true, text: plain(s)}
			continue
		}
		x, err := Measured(f.Name, f.Unit, f.CSV).cell(f.Value)
		if err != nil {
			return nil, fmt.Errorf("figure %d, %w", i+1, err)
		}
		cells[i] = x
	}
	return cells, nil
}

// grid lays the figures out as lines of name, value, interval and remark. Columns that would be empty
// throughout are left out.
func (fs figureList) grid() (*grid, error) {
	cells, err := fs.cells()
	if err != nil {
		return nil, err
	}
	g := &grid{columns: []gridColumn{
		{head: "Quantity", label: true}, {head: "Value", align: decimal, label: true}, {head: "95\u00a0% interval"}, {head: "Remark", flexible: true},
	}}
	hasInterval, hasRemark := false, false
	for i, f := range fs {
		x := cells[i]
		line := []string{plain(f.Name), dash, "", plain(f.Remark)}
		switch {
		case x.text != "":
			line[1] = x.text
		case x.full:
			s := scaleOf(f.Unit, x)
			line[1] = s.withUnit(s.measured(x))
			if x.bounded() {
				line[2] = s.interval(x, true)
				hasInterval = true
			}
		}
		hasRemark = hasRemark || f.Remark != ""
		g.rows = append(g.rows, line)
	}
	if !hasRemark {
		g.drop(3)
	}
	if !hasInterval {
		g.drop(2)
	}
	return g, nil
}

// csv has one row a figure, its name first.
func (fs figureList) csv() ([][]string, error) {
	cells, err := fs.cells()
	if err != nil || len(fs) == 0 {
		return nil, err
	}
	records := [][]string{{"figure", "value", "u", "low", "high", "remark"}}
	for i, f := range fs {
		name := f.CSV
		if name == "" {
			name = f.Name
		}
		record := []string{guardCSV(plain(name))}
		if x := cells[i]; x.text != "" {
			record = append(record, guardCSV(x.text), "", "", "")
		} else {
			record = x.appendCSV(record, measured)
			record = x.appendCSV(record, interval)
		}
		records = append(records, append(record, guardCSV(plain(f.Remark))))
	}
	return records, nil
}
