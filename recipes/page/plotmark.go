package page

import (
	"math"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// markLayer is one point with its name beside it.
type markLayer struct {
	Series
	x, y float64
}

func (m *markLayer) check(x, y Axis) error {
	if err := x.checkValues([]float64{m.x}); err != nil {
		return err
	}
	return y.checkValues([]float64{m.y})
}

func (m *markLayer) extent(x, y *reach) { seePairs(x, y, []float64{m.x}, []float64{m.y}) }

func (m *markLayer) draw(p *pane) {
	const r = length(4.5)
	at := p.at(m.x, m.y)
	if !shown(at) {
		return
	}
	corner := vg.Point{X: r + 2, Y: r + 2}
	p.busy.block(vg.Rectangle{Min: at.Sub(corner), Max: at.Add(corner)})
	label := p.fit(m.name, smallSize, (p.Max.X-p.Min.X)*0.6)
	w, h := p.width(label, smallSize), length(smallSize*1.15)
	choose := func() {
		var candidates []spot
		for _, far := range []length{r + 5, r + 12} {
			for _, up := range []length{far - 4, 4 - far - h, -h / 2} {
				candidates = append(candidates,
					spot{at.Add(vg.Point{X: far, Y: up}), text.XLeft},
					spot{at.Add(vg.Point{X: -far - w, Y: up}), text.XRight})
			}
			candidates = append(candidates,
				spot{at.Add(vg.Point{X: -w / 2, Y: far}), text.XCenter},
				spot{at.Add(vg.Point{X: -w / 2, Y: -far - h}), text.XCenter})
		}
		p.place(label, candidates)
	}
	p.later = append([]func(){choose}, p.later...) // before the contours' labels, which have more room
	p.last = append(p.last, func() {
		var ring vg.Path
		ring.Move(vg.Point{X: at.X + r, Y: at.Y})
		ring.Arc(at, r, 0, 2*math.Pi)
		ring.Close()
		for _, d := range []vg.Point{{X: 1}, {X: -1}, {Y: 1}, {Y: -1}} {
			ring.Move(at.Add(d.Scale(1.5)))
			ring.Line(at.Add(d.Scale(r + 2.5)))
		}
		p.SetLineStyle(draw.LineStyle{Color: ink, Width: 1.5})
		p.Stroke(ring)
	})
}

func (m *markLayer) swatch(*sheet, vg.Point, length) {}

// ruleLayer is a line for reference across the whole panel.
type ruleLayer struct {
	Series
	at      float64
	upright bool
}

func (r *ruleLayer) check(x, y Axis) error {
	if r.upright {
		return x.checkValues([]float64{r.at})
	}
	return y.checkValues([]float64{r.at})
}

func (r *ruleLayer) extent(x, y *reach) {
	if r.upright {
		x.see(r.at)
	} else {
		y.see(r.at)
	}
}

func (r *ruleLayer) draw(p *pane) {
	a, b := p.at(r.at, 0), p.at(r.at, 0)
	a.Y, b.Y = p.Min.Y, p.Max.Y
	if !r.upright {
		at := p.at(0, r.at).Y
		a, b = vg.Point{X: p.Min.X, Y: at}, vg.Point{X: p.Max.X, Y: at}
	}
	if !shown(a) || !shown(b) {
		return
	}
	p.StrokeLine2(draw.LineStyle{Color: ink, Width: 0.8, Dashes: []vg.Length{2.5, 2}}, a.X, a.Y, b.X, b.Y)
	p.busy.line(a, b)
	label := p.fit(r.name, smallSize, (p.Max.X-p.Min.X)*0.6)
	w, h := p.width(label, smallSize), length(smallSize*1.15)
	p.later = append(p.later, func() {
		var candidates []spot
		for _, far := range []length{1, 4} {
			for _, share := range []length{1, 0, 0.75, 0.5, 0.25} {
				if r.upright {
					y := p.Min.Y + share*(p.Max.Y-p.Min.Y-h)
					candidates = append(candidates,
						spot{vg.Point{X: a.X + far + 2, Y: y}, text.XLeft},
						spot{vg.Point{X: a.X - far - 2 - w, Y: y}, text.XRight})
				} else {
					x := p.Min.X + 3 + share*(p.Max.X-p.Min.X-w-6)
					candidates = append(candidates,
						spot{vg.Point{X: x, Y: a.Y + far}, text.XCenter},
						spot{vg.Point{X: x, Y: a.Y - far - h}, text.XCenter})
				}
			}
		}
		p.place(label, candidates)
	})
}

func (r *ruleLayer) swatch(*sheet, vg.Point, length) {}
