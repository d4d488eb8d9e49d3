package page

import (
	"fmt"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
)

// legend is the names of the series with samples, in rows beneath the figure.
type legend struct {
	entries []legendEntry
	rows    [][]legendEntry
	more    string // what did not fit, in words
}

type legendEntry struct {
	layer layer
	name  string
	about string // what stands behind the name and is never cut
}

// legend lists the series that have a name and a sample. One that looks alike in two panels is listed once.
func (p *Plot) legend() *legend {
	type seen struct {
		name string
		look look
		kind int
	}
	known := make(map[seen]bool)
	k := &legend{}
	for _, q := range p.panels() {
		for _, l := range q.layers {
			s := l.series()
			name, about := s.name, ""
			switch l := l.(type) {
			case *markLayer, *ruleLayer: // named where they stand
				continue
			case *Points:
				if l.bars != "" {
					about = " (bars: " + l.bars + ")"
				}
				if len(l.y) > manyPoints {
					about += " (thinned)"
				}
			}
			id := seen{name + about, s.looks, depth(l)}
			if name == "" || known[id] {
				continue
			}
			known[id] = true
			k.entries = append(k.entries, legendEntry{l, name, about})
		}
	}
	return k
}

const (
	lineSample   = length(24)
	pointSample  = length(8)
	rowHeight    = length(14)
	mostRows     = 4
	betweenNames = length(16)
)

// layOut fills rows of a width and gives their height. Names get a tenth more than they measure, for a reader
// whose typeface runs wider.
func (k *legend) layOut(s *sheet, width length) length {
	var row []legendEntry
	used := length(0)
	for i, e := range k.entries {
		e.name = s.fit(e.name, textSize, width-lineSample-betweenNames-s.width(e.about, textSize)) + e.about
		w := k.entryWidth(s, e)
		if len(row) > 0 && used+w > width {
			if k.rows, row, used = append(k.rows, row), nil, 0; len(k.rows) == mostRows {
				k.more = fmt.Sprintf("and %d more", len(k.entries)-i)
				break
			}
		}
		row, used = append(row, e), used+w
	}
	if len(row) > 0 {
		k.rows = append(k.rows, row)
	}
	n := len(k.rows)
	if k.more != "" {
		n++
	}
	if n == 0 {
		return 0
	}
	return length(n)*rowHeight + 6
}

func (k *legend) entryWidth(s *sheet, e legendEntry) length {
	return e.sample() + 5 + s.width(e.name, textSize)*1.1 + betweenNames
}

// sample is the width of the sample.
func (e legendEntry) sample() length {
	if _, ok := e.layer.(*Points); ok {
		return pointSample
	}
	return lineSample
}

// draw sets the rows with their upper left corner at x, y.
func (k *legend) draw(s *sheet, x, y length) {
	y -= 6 + rowHeight/2
	for _, row := range k.rows {
		at := x
		for _, e := range row {
			e.layer.swatch(s, vg.Point{X: at, Y: y}, e.sample())
			s.write(e.name, textSize, vg.Point{X: at + e.sample() + 5, Y: y + 1}, text.XLeft, text.YCenter)
			at += k.entryWidth(s, e)
		}
		y -= rowHeight
	}
	if k.more != "" {
		s.write(k.more, textSize, vg.Point{X: x, Y: y + 1}, text.XLeft, text.YCenter)
	}
}
