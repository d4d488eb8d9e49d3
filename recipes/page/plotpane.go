package page

import (
	"math"
	"slices"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// pane is the area between a panel's axes while it is drawn. Layers draw at once what must lie below, note where
// data are, and leave to later what looks for a free place: first labels, then what gives way to labels.
type pane struct {
	*sheet
	x, y   *ruler
	xAxis  Axis
	busy   *occupancy
	labels []vg.Rectangle // the places taken by labels
	later  []func()       // places labels
	last   []func()       // draws around them
	dodge  float64        // what a series of points is moved by on an axis of categories
}

// at is a point of the data on the sheet; its coordinates are NaN when it cannot be shown.
func (p *pane) at(x, y float64) vg.Point {
	return vg.Point{X: p.X(p.x.at(x)), Y: p.Y(p.y.at(y))}
}

func shown(p vg.Point) bool { return !math.IsNaN(float64(p.X)) && !math.IsNaN(float64(p.Y)) }

// depth is the order in which layers are drawn.
func depth(l layer) int {
	switch l.(type) {
	case *bandLayer:
		return 0
	case *ruleLayer:
		return 1
	case *Contours:
		return 2
	case *lineLayer:
		return 3
	case *Points:
		return 4
	}
	return 5
}

// draw fills the pane.
func (q *Panel) draw(p *pane) {
	p.lines()
	layers := slices.Clone(q.layers)
	slices.SortStableFunc(layers, func(a, b layer) int { return depth(a) - depth(b) })
	p.spread(layers)
	for _, f := range p.later {
		f()
	}
	for _, f := range p.last { // places of labels have come to it
		f()
	}
	if !q.anyData() {
		p.write("no data", textSize, p.Center(), text.XCenter, text.YCenter)
	}
}

// spread draws the layers; points of several series at one category stand beside each other.
func (p *pane) spread(layers []layer) {
	count, i := 0, 0
	for _, l := range layers {
		if _, ok := l.(*Points); ok {
			count++
		}
	}
	for _, l := range layers {
		p.dodge = 0
		if _, ok := l.(*Points); ok && p.xAxis.scale == category {
			p.dodge = (float64(i) - float64(count-1)/2) * math.Min(0.16, 0.7/float64(count))
			i++
		}
		l.draw(p)
	}
}

func (q *Panel) anyData() bool {
	var x, y reach
	for _, l := range q.layers {
		if _, ok := l.(*ruleLayer); !ok {
			l.extent(&x, &y)
		}
	}
	return x.any && y.any
}

// lines draws the light grid at the labelled ticks.
func (p *pane) lines() {
	var g vg.Path
	for _, t := range p.x.ticks {
		if t.label != "" && p.xAxis.scale != category {
			g.Move(vg.Point{X: p.X(t.at), Y: p.Min.Y})
			g.Line(vg.Point{X: p.X(t.at), Y: p.Max.Y})
		}
	}
	for _, t := range p.y.ticks {
		if t.label != "" {
			g.Move(vg.Point{X: p.Min.X, Y: p.Y(t.at)})
			g.Line(vg.Point{X: p.Max.X, Y: p.Y(t.at)})
		}
	}
	p.SetLineStyle(draw.LineStyle{Color: faint(ink, 36), Width: 0.5})
	p.Stroke(g)
}

// spot is where a label might stand: the lower left corner of its box, and the side from which a wider typeface
// would grow.
type spot struct {
	vg.Point
	grow text.XAlignment
}

// place sets a label at the candidate where it covers least, the preferred first, and keeps the place.
func (p *pane) place(label string, candidates []spot) {
	w, h := p.width(label, smallSize), length(smallSize*1.15)
	if len(candidates) == 0 || label == "" {
		return
	}
	best, grow, least := vg.Rectangle{}, text.XCenter, math.MaxInt
	for _, c := range candidates {
		c.X = max(p.Min.X+1, min(c.X, p.Max.X-w-1))
		c.Y = max(p.Min.Y+1, min(c.Y, p.Max.Y-h))
		box := vg.Rectangle{Min: c.Point, Max: c.Add(vg.Point{X: w, Y: h})}
		if n := p.busy.count(box); n < least {
			best, grow, least = box, c.grow, n
		}
	}
	p.busy.block(best)
	p.labels = append(p.labels, best)
	p.last = append(p.last, func() {
		x := best.Min.X - w*length(grow) // XLeft is 0, XRight is -1
		p.write(label, smallSize, vg.Point{X: x, Y: best.Min.Y + h*0.5 + 1}, grow, text.YCenter)
	})
}

// occupancy notes what lies where, in square cells.
type occupancy struct {
	area       vg.Rectangle
	cols, rows int
	counts     []int // 0: free, 1: data, more: labels
}

const cellSize = length(3)

func newOccupancy(area vg.Rectangle) *occupancy {
	o := &occupancy{area: area, cols: 1 + int((area.Max.X-area.Min.X)/cellSize), rows: 1 + int((area.Max.Y-area.Min.Y)/cellSize)}
	o.counts = make([]int, max(1, o.cols*o.rows))
	return o
}

func (o *occupancy) cell(p vg.Point) (i, j int) {
	return int(math.Floor(float64((p.X - o.area.Min.X) / cellSize))), int(math.Floor(float64((p.Y - o.area.Min.Y) / cellSize)))
}

// point notes a point, line a straight line, block the place of a label.
func (o *occupancy) point(p vg.Point) {
	if !shown(p) {
		return
	}
	if i, j := o.cell(p); i >= 0 && j >= 0 && i < o.cols && j < o.rows && o.counts[j*o.cols+i] == 0 {
		o.counts[j*o.cols+i] = 1
	}
}

func (o *occupancy) line(a, b vg.Point) {
	if !shown(a) || !shown(b) {
		return
	}
	d := b.Sub(a)
	n := 1 + int(math.Min(1000, math.Hypot(float64(d.X), float64(d.Y))/float64(cellSize)))
	for k := 0; k < n; k++ {
		o.point(a.Add(d.Scale(length(k) / length(n))))
	}
}

func (o *occupancy) block(r vg.Rectangle) {
	i0, j0 := o.cell(r.Min)
	i1, j1 := o.cell(r.Max)
	for j := max(0, j0); j <= min(j1, o.rows-1); j++ {
		for i := max(0, i0); i <= min(i1, o.cols-1); i++ {
			o.counts[j*o.cols+i] += 1000
		}
	}
}

func (o *occupancy) count(r vg.Rectangle) int {
	n := 0
	i0, j0 := o.cell(r.Min)
	i1, j1 := o.cell(r.Max)
	for j := max(0, j0); j <= min(j1, o.rows-1); j++ {
		for i := max(0, i0); i <= min(i1, o.cols-1); i++ {
			n += o.counts[j*o.cols+i]
		}
	}
	return n
}
