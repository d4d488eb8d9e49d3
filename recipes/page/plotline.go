package page

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// lineLayer is points joined by straight lines.
type lineLayer struct {
	Series
	x, y []float64
}

func (l *lineLayer) check(x, y Axis) error {
	if err := x.checkX(l.x, len(l.y)); err != nil {
		return err
	}
	return y.checkValues(l.y)
}

func (l *lineLayer) extent(x, y *reach) { seePairs(x, y, l.x, l.y) }

// seePairs makes axes show the pairs of which both values can be shown; x may be nil.
func seePairs(x, y *reach, xs, ys []float64) {
	for i, v := range ys {
		if xs == nil {
			x.see(float64(i))
			y.see(v)
		} else if plottable(v) && plottable(xs[i]) {
			x.see(xs[i])
			y.see(v)
		}
	}
}

func (l *lineLayer) draw(p *pane) {
	xs := p.xAxis.at(l.x, len(l.y))
	pts := make([]vg.Point, len(l.y))
	for i := range pts {
		pts[i] = p.at(xs[i], l.y[i])
	}
	runs := thinLine(pts, column)
	width := stroke
	if turns(runs) > 200 { // noise, which would fill the figure with ink
		width *= 0.65
	}
	p.strokeRuns(l.looks.line(width), runs)
}

// turns counts how often lines turn from up to down or back.
func turns(runs [][]vg.Point) int {
	n := 0
	for _, r := range runs {
		for i := 2; i < len(r); i++ {
			if (r[i].Y-r[i-1].Y)*(r[i-1].Y-r[i-2].Y) < 0 {
				n++
			}
		}
	}
	return n
}

// strokeRuns draws lines, a lone point as a dot.
func (p *pane) strokeRuns(sty draw.LineStyle, runs [][]vg.Point) {
	var path vg.Path
	for _, run := range runs {
		if len(run) == 1 {
			half := vg.Point{X: sty.Width / 2}
			run = []vg.Point{run[0].Sub(half), run[0].Add(half)}
		}
		for i, q := range run {
			if i == 0 {
				path.Move(q)
			} else {
				path.Line(q)
				p.busy.line(run[i-1], q)
			}
		}
	}
	p.SetLineStyle(sty)
	p.Stroke(path)
}

func (l *lineLayer) swatch(c *sheet, at vg.Point, w length) {
	swatchLine(c, l.looks, at, w)
}

func swatchLine(c *sheet, k look, at vg.Point, w length) {
	c.StrokeLine2(k.line(stroke), at.X, at.Y, at.X+w, at.Y)
}

// bandLayer is the area between two lines.
type bandLayer struct {
	Series
	x, low, high []float64
}

func (l *bandLayer) check(x, y Axis) error {
	if len(l.low) != len(l.high) {
		return fmt.Errorf("%d lower ends for %d upper ends; give as many", len(l.low), len(l.high))
	}
	if err := x.checkX(l.x, len(l.low)); err != nil {
		return err
	}
	if !ascending(l.x) {
		return errors.New("x does not ascend; sort the band by x")
	}
	if err := y.checkValues(l.low); err != nil {
		return err
	}
	return y.checkValues(l.high)
}

// ascending says that no value is below the one before; NaN are passed over.
func ascending(x []float64) bool {
	last := math.Inf(-1)
	for _, v := range x {
		if v < last {
			return false
		}
		if !math.IsNaN(v) {
			last = v
		}
	}
	return true
}

func (l *bandLayer) extent(x, y *reach) {
	seePairs(x, y, l.x, l.low)
	seePairs(x, y, l.x, l.high)
}

func (l *bandLayer) draw(p *pane) {
	xs := p.xAxis.at(l.x, len(l.low))
	low, high := make([]vg.Point, len(l.low)), make([]vg.Point, len(l.low))
	for i := range low {
		low[i], high[i] = p.at(xs[i], l.low[i]), p.at(xs[i], l.high[i])
		if !shown(low[i]) || !shown(high[i]) { // the two have their gaps at the same places
			low[i].X, high[i].X = length(math.NaN()), length(math.NaN())
		}
	}
	lows, highs := thinLine(low, column), thinLine(high, column)
	var area, edges vg.Path
	for k := range min(len(lows), len(highs)) {
		back := slices.Clone(lows[k])
		slices.Reverse(back)
		outline := append(slices.Clone(highs[k]), back...)
		for i, q := range outline {
			if i == 0 {
				area.Move(q)
			} else {
				area.Line(q)
			}
			if i == 0 || i == len(highs[k]) {
				edges.Move(q)
			} else {
				edges.Line(q)
				p.busy.line(outline[i-1], q)
			}
		}
		area.Close()
	}
	p.SetColor(faint(l.looks.paint(), 46))
	p.Fill(area)
	p.SetLineStyle(draw.LineStyle{Color: faint(l.looks.paint(), 150), Width: 0.4})
	p.Stroke(edges)
}

func (l *bandLayer) swatch(c *sheet, at vg.Point, w length) {
	r := vg.Rectangle{Min: at.Sub(vg.Point{Y: 3.5}), Max: at.Add(vg.Point{X: w, Y: 3.5})}
	c.SetColor(faint(l.looks.paint(), 46))
	c.Fill(r.Path())
	c.SetLineStyle(draw.LineStyle{Color: faint(l.looks.paint(), 150), Width: 0.4})
	c.Stroke(r.Path())
}
