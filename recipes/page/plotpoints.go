package page

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// Points is a series of markers, with error bars where they were given.
type Points struct {
	Series
	x, y, low, high []float64
	bars            string // what the bars are, for the legend; "" for none
}

// Interval95 draws a bar from low to high at each point, the ends of its 95 % interval. The legend says so.
func (s *Points) Interval95(low, high []float64) *Points {
	s.low, s.high, s.bars = slices.Clone(low), slices.Clone(high), "95\u00a0% interval"
	if len(low) != len(s.y) || len(high) != len(s.y) {
		s.err = fmt.Errorf("%d lower and %d upper ends of intervals for %d points; give as many", len(low), len(high), len(s.y))
	}
	return s
}

// K1 draws a bar of one standard uncertainty u (coverage factor k = 1) to both sides of each point. The legend says so.
func (s *Points) K1(u []float64) *Points {
	s.low, s.high, s.bars = make([]float64, len(u)), make([]float64, len(u)), "k\u00a0=\u00a01"
	if len(u) != len(s.y) {
		s.err = fmt.Errorf("%d uncertainties for %d points; give as many", len(u), len(s.y))
		return s
	}
	for i := range u {
		if u[i] < 0 {
			s.err = fmt.Errorf("uncertainty is %g at index %d; a standard uncertainty is not below zero", u[i], i)
		}
		s.low[i], s.high[i] = s.y[i]-u[i], s.y[i]+u[i]
	}
	return s
}

func (s *Points) check(x, y Axis) error {
	if err := x.checkX(s.x, len(s.y)); err != nil {
		return err
	}
	return y.checkValues(s.y)
}

func (s *Points) extent(x, y *reach) {
	x.pad = true
	seePairs(x, y, s.x, s.y)
	for i := range s.low {
		if plottable(s.y[i]) && (s.x == nil || plottable(s.x[i])) {
			y.see(s.low[i], s.high[i])
		}
	}
}

func (s *Points) draw(p *pane) {
	xs := p.xAxis.at(s.x, len(s.y))
	pts := make([]vg.Point, len(s.y))
	for i := range pts {
		pts[i] = p.at(xs[i]+p.dodge, s.y[i])
	}
	keep := thinPoints(pts, s.low, s.high)
	var bars, marks, lines vg.Path
	for _, i := range keep {
		p.busy.point(pts[i])
		if s.bars != "" {
			p.addBar(&bars, pts[i], s.low[i], p.Min.Y, len(keep) <= manyPoints)
			p.addBar(&bars, pts[i], s.high[i], p.Max.Y, len(keep) <= manyPoints)
		}
		switch {
		case len(keep) > manyPoints:
			lines.Move(pts[i].Sub(vg.Point{X: 0.8}))
			lines.Line(pts[i].Add(vg.Point{X: 0.8}))
		case !s.looks.addMarker(&marks, pts[i]):
			lines, marks = append(lines, marks...), nil
		}
	}
	colour := s.looks.paint()
	p.SetLineStyle(draw.LineStyle{Color: colour, Width: 0.9})
	p.Stroke(bars)
	width := length(1.3)
	if len(keep) > manyPoints {
		width = 1.6
	}
	p.SetLineStyle(draw.LineStyle{Color: colour, Width: width})
	p.Stroke(lines)
	p.SetColor(colour)
	p.Fill(marks)
}

// manyPoints is how many points keep their marker; more are dots.
const manyPoints = 2000

// addBar adds half an error bar, from a point to the end at v, with a cap. An end that the axis cannot show, such as
// one below zero on a logarithmic axis, is drawn to the edge without a cap; one that is no number is left out.
func (p *pane) addBar(path *vg.Path, at vg.Point, v float64, edge length, capped bool) {
	if math.IsNaN(v) {
		return
	}
	const half = length(2.4)
	end := vg.Point{X: at.X, Y: p.Y(p.y.at(v))}
	if !(end.Y >= p.Min.Y && end.Y <= p.Max.Y) {
		end.Y, capped = edge, false
	}
	if end == at {
		return
	}
	path.Move(at)
	path.Line(end)
	p.busy.line(at, end)
	if capped {
		path.Move(end.Sub(vg.Point{X: half}))
		path.Line(end.Add(vg.Point{X: half}))
	}
}

func (s *Points) swatch(c *sheet, at vg.Point, w length) {
	at.X += w / 2
	colour := s.looks.paint()
	if s.bars != "" {
		c.StrokeLine2(draw.LineStyle{Color: colour, Width: 0.9}, at.X, at.Y-5, at.X, at.Y+5)
	}
	var m vg.Path
	if s.looks.addMarker(&m, at) {
		c.SetColor(colour)
		c.Fill(m)
		return
	}
	c.SetLineStyle(draw.LineStyle{Color: colour, Width: 1.3})
	c.Stroke(m)
}
