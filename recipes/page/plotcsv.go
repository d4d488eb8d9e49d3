package page

import (
	"slices"
	"strconv"
)

// recorder writes one row of a plot's CSV; what is "" is left empty.
type recorder func(x, y, low, high, z string)

// csv gives the data of all series, unscaled, one row a value: the series' name, its x, and the columns of its
// panel's y with both ends of an interval or a band. The values of contours have a column of their own.
func (p *Plot) csv() ([][]string, error) {
	if err := p.check(); err != nil {
		return nil, err
	}
	head := []string{"series", p.x.csv}
	find := func(name string, n int) int { // the column of a name, with n-1 beside it
		if i := slices.Index(head[2:], name); i >= 0 {
			return i + 2
		}
		head = append(head, name)
		if n == 3 {
			head = append(head, name+"_low", name+"_high")
		}
		return len(head) - n
	}
	type columns struct{ y, z int }
	var places []columns
	for _, q := range p.panels() {
		y := find(q.y.csv, 3)
		for _, l := range q.layers {
			c := columns{y: y}
			if k, ok := l.(*Contours); ok {
				c.z = find(k.z.csv, 1)
			}
			places = append(places, c)
		}
	}
	records := [][]string{head}
	i := 0
	for _, q := range p.panels() {
		for _, l := range q.layers {
			name, c := guardCSV(l.series().name), places[i]
			i++
			l.records(p.x, func(x, y, low, high, z string) {
				row := make([]string, len(head))
				row[0], row[1] = name, x
				row[c.y], row[c.y+1], row[c.y+2] = y, low, high
				if c.z > 0 {
					row[c.z] = z
				}
				records = append(records, row)
			})
		}
	}
	return records, nil
}

// field writes a value along the axis: a category in words.
func (a Axis) field(v float64) string {
	if i := int(v); a.scale == category && v == float64(i) && i >= 0 && i < len(a.words) {
		return guardCSV(a.words[i])
	}
	return csvNumber(v)
}

func (l *lineLayer) records(x Axis, row recorder) {
	for i, at := range x.at(l.x, len(l.y)) {
		row(x.field(at), csvNumber(l.y[i]), "", "", "")
	}
}

func (s *Points) records(x Axis, row recorder) {
	for i, at := range x.at(s.x, len(s.y)) {
		low, high := "", ""
		if s.bars != "" {
			low, high = csvNumber(s.low[i]), csvNumber(s.high[i])
		}
		row(x.field(at), csvNumber(s.y[i]), low, high, "")
	}
}

func (l *bandLayer) records(x Axis, row recorder) {
	for i, at := range x.at(l.x, len(l.low)) {
		row(x.field(at), "", csvNumber(l.low[i]), csvNumber(l.high[i]), "")
	}
}

func (s *Contours) records(_ Axis, row recorder) {
	for i, x := range s.x {
		for j, y := range s.y {
			row(csvNumber(x), csvNumber(y), "", "", csvNumber(s.values[i][j]))
		}
	}
}

func (m *markLayer) records(x Axis, row recorder) { row(x.field(m.x), csvNumber(m.y), "", "", "") }

func (r *ruleLayer) records(x Axis, row recorder) {
	if r.upright {
		row(x.field(r.at), "", "", "", "")
	} else {
		row("", csvNumber(r.at), "", "", "")
	}
}

// tickText writes a number that need not be round, to four digits.
func tickText(v float64) string {
	v, _ = strconv.ParseFloat(strconv.FormatFloat(v, 'e', 3, 64), 64)
	s := strconv.FormatFloat(v, 'g', -1, 64)
	if s[0] == '-' {
		return "\u2212" + s[1:]
	}
	return s
}
