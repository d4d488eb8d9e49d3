package page

import (
	"bytes"
	"fmt"
	"io"
	"math"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"
)

// SVG draws the plot as an svg element to stand in an HTML page, or in a file by itself. It has a viewBox of
// 150 mm width in points and no fixed size: give the class "plot" a width. Black is currentColor, the background
// is clear, and nothing is loaded from elsewhere. The same data give the same bytes on every machine.
func (p *Plot) SVG() ([]byte, error) {
	if err := p.check(); err != nil {
		return nil, err
	}
	s := newSVG(figureWidth, p.height(), p.Alt())
	p.draw(draw.NewCanvas(s, figureWidth, p.height()))
	return s.bytes(), nil
}

// PNG draws the plot as an image on white, 150 mm wide at the resolution dpi (dots per inch): from 50 to 1200.
// Nothing is written when there is an error.
func (p *Plot) PNG(w io.Writer, dpi int) error {
	if dpi < 50 || dpi > 1200 {
		return fmt.Errorf("plot %q: %d dots per inch; give 50 to 1200", p.title, dpi)
	}
	if err := p.check(); err != nil {
		return err
	}
	c := vgimg.NewWith(vgimg.UseWH(figureWidth, p.height()), vgimg.UseDPI(dpi))
	p.draw(draw.New(c))
	var buf bytes.Buffer
	if _, err := (vgimg.PngCanvas{Canvas: c}).WriteTo(&buf); err != nil {
		return fmt.Errorf("plot %q as PNG: %w", p.title, err)
	}
	if _, err := w.Write(buf.Bytes()); err != nil {
		return fmt.Errorf("plot %q as PNG: %w", p.title, err)
	}
	return nil
}

// height is the figure's.
func (p *Plot) height() length { return figureHeight + lowerHeight*length(len(p.below)) }

// sheet is a surface with our type on it.
type sheet struct {
	draw.Canvas
	hand svgText
}

func (s *sheet) font(size length, x text.XAlignment, y text.YAlignment) text.Style {
	return text.Style{Color: ink, Font: typeface(size), XAlign: x, YAlign: y, Handler: s.hand}
}

// write sets text at a point and width measures it.
func (s *sheet) write(t string, size length, at vg.Point, x text.XAlignment, y text.YAlignment) {
	s.FillText(s.font(size, x, y), at, t)
}

func (s *sheet) width(t string, size length) length {
	return s.font(size, text.XLeft, text.YBottom).Width(t)
}

// fit cuts text that is wider than w.
func (s *sheet) fit(t string, size, w length) string {
	runes := []rune(t)
	if n := max(1, int(w)); len(runes) > n { // no letter is as narrow as a point
		runes = runes[:n]
	} else if s.width(t, size) <= w {
		return t
	}
	for len(runes) > 0 && s.width(string(runes)+"…", size) > w {
		runes = runes[:len(runes)-1]
	}
	return string(runes) + "…"
}

// draw lays the panels out one under the other with the legend beneath, where it covers no data.
func (p *Plot) draw(c draw.Canvas) {
	s := &sheet{c, svgText{text.Plain{Fonts: font.DefaultCache}}}
	const (
		margin   = 4  // around the figure
		between  = 9  // of panels
		axisBand = 27 // tick labels and label under the last panel
	)
	s.Min, s.Max = s.Min.Add(vg.Point{X: margin, Y: margin}), s.Max.Sub(vg.Point{X: margin, Y: margin})
	panels := p.panels()
	key := p.legend()
	legendHeight := key.layOut(s, s.Max.X-s.Min.X-40)

	data := s.Max.Y - s.Min.Y - legendHeight - axisBand - between*length(len(panels)-1)
	heights := make([]length, len(panels))
	for i := range heights {
		switch {
		case p.x.scale == category:
			heights[i] = data / length(len(panels))
		case i == 0:
			heights[i] = data - (lowerHeight-between)*length(len(panels)-1)
		default:
			heights[i] = lowerHeight - between
		}
	}
	heights[len(panels)-1] += axisBand

	x := p.ruleX(s)
	frames, areas := make([]*frame, len(panels)), make([]draw.Canvas, len(panels))
	top := s.Max.Y
	left, right := s.Min.X, s.Max.X
	for i, q := range panels {
		areas[i] = s.Canvas
		areas[i].Max.Y, areas[i].Min.Y = top, top-heights[i]
		top -= heights[i] + between
		frames[i] = newFrame(s, q, p.x, x, i == len(panels)-1, heights[i])
		inner := frames[i].DataCanvas(areas[i])
		left, right = max(left, inner.Min.X), min(right, inner.Max.X)
	}
	for i, f := range frames { // the vertical axes stand in line, and so do their labels
		inner := f.DataCanvas(areas[i])
		f.Y.Label.Padding += left - inner.Min.X
		areas[i].Max.X -= inner.Max.X - right
		f.Draw(areas[i])
	}
	key.draw(s, left, s.Min.Y+legendHeight)
}

// ruleX fits the horizontal axis around the data of all panels.
func (p *Plot) ruleX(s *sheet) *ruler {
	x, y := reach{positive: p.x.scale == logarithmic}, reach{}
	for _, q := range p.panels() {
		for _, l := range q.layers {
			l.extent(&x, &y)
		}
	}
	across, apart := s.Max.X-s.Min.X-50, length(14)
	if p.x.scale == logarithmic { // only some of its ticks stand close
		apart = 7
	}
	return newRuler(p.x, x, func(label string) float64 {
		return float64((s.width(s.fit(label, textSize, 100), textSize)*1.2 + apart) / across)
	})
}

// frame is a panel's axes, drawn by gonum/plot, which also places the panel's data. Its coordinates go from 0 to
// 1 along each axis; the rulers know what they mean.
type frame struct{ *plot.Plot }

// plotterFunc is a plot.Plotter.
type plotterFunc func(draw.Canvas)

func (f plotterFunc) Plot(c draw.Canvas, _ *plot.Plot) { f(c) }

func newFrame(s *sheet, q *Panel, xAxis Axis, x *ruler, last bool, height length) *frame {
	xr, yr := reach{}, reach{positive: q.y.scale == logarithmic}
	for _, l := range q.layers {
		l.extent(&xr, &yr)
	}
	yr.pad = yr.pad || !q.gridded()
	y := newRuler(q.y, yr, func(string) float64 { return 2.2 * textSize / float64(height-27) })

	f := &frame{plot.New()}
	f.BackgroundColor = nil
	for _, a := range []struct {
		axis   *plot.Axis
		ruler  *ruler
		across length
		shown  bool
	}{{&f.X, x, s.Max.X - s.Min.X - 50, last}, {&f.Y, y, height, true}} {
		a.axis.Min, a.axis.Max = 0, 1
		a.axis.LineStyle = draw.LineStyle{Color: ink, Width: thin}
		a.axis.Tick.LineStyle = a.axis.LineStyle
		a.axis.Tick.Length = 3.5
		a.axis.Padding = 0
		a.axis.Label.Padding = 3
		a.axis.Label.TextStyle.Font, a.axis.Label.TextStyle.Handler = typeface(textSize), s.hand
		a.axis.Tick.Label.Font, a.axis.Tick.Label.Handler = typeface(textSize), s.hand
		var ticks plot.ConstantTicks
		for _, t := range a.ruler.ticks {
			label := ""
			if a.shown {
				label = s.fit(t.label, textSize, 100)
			}
			if t.at = math.Max(0, math.Min(1, t.at)); !math.IsNaN(t.at) {
				ticks = append(ticks, plot.Tick{Value: t.at, Label: label})
			}
		}
		a.axis.Tick.Marker = ticks
		if a.shown {
			unit := ""
			if a.ruler.symbol != "" {
				unit = " / " + s.fit(a.ruler.symbol, textSize, a.across*0.4)
			}
			a.axis.Label.Text = s.fit(a.ruler.axis.name, textSize, a.across*0.95-s.width(unit, textSize)) + unit
		}
	}
	f.Add(plotterFunc(func(c draw.Canvas) {
		q.draw(&pane{sheet: &sheet{c, s.hand}, x: x, y: y, xAxis: xAxis, busy: newOccupancy(c.Rectangle)})
	}))
	return f
}

// gridded says whether the panel shows contours, whose grid fills it to the edge.
func (q *Panel) gridded() bool {
	for _, l := range q.layers {
		if _, ok := l.(*Contours); ok {
			return true
		}
	}
	return false
}
