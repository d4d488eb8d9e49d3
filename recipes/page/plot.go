package page

import (
	"fmt"
	"slices"
	"strings"

	"gonum.org/v1/plot/vg"

	"ringbook/snubber"
)

// Plot is a figure of one or more panels that share the horizontal axis. Data are SI values; the axes take
// one SI prefix each. It is drawn with gonum.org/v1/plot, 150 mm wide, by SVG and PNG.
//
// The title is not drawn: it is the figure's caption, and the page sets it in its own type. Alt says in words
// what the figure shows.
//
// Values that are NaN or infinite are left out, and a line has a gap there. Mistakes, such as slices of unlike
// length or a zero on a logarithmic axis, are found when the plot is rendered; the error names the plot and the
// series. Slices are copied. A plot is filled by one goroutine.
type Plot struct {
	Panel
	title string
	x     Axis
	below []*Panel
}

// Panel is one pair of axes and the series drawn in it.
type Panel struct {
	y      Axis
	layers []layer
}

// NewPlot gives a plot without data. Its series are put on by the methods of Panel.
func NewPlot(title string, x, y Axis) *Plot {
	return &Plot{Panel: Panel{y: y}, title: strings.TrimSpace(plain(title)), x: x}
}

// Below adds a panel under the plot that shares its horizontal axis, such as one of residuals.
func (p *Plot) Below(y Axis) *Panel {
	q := &Panel{y: y}
	p.below = append(p.below, q)
	return q
}

func (p *Plot) panels() []*Panel { return append([]*Panel{&p.Panel}, p.below...) }

// layer is a kind of series.
type layer interface {
	series() *Series
	check(x, y Axis) error                  // what is wrong with the data for these axes
	extent(x, y *reach)                     // what the axes must show
	draw(*pane)                             // in the order of the panel's layers
	swatch(c *sheet, at vg.Point, w length) // the sample in the legend, or nothing
	describe(x, y Axis) string              // a clause for Alt
	records(x Axis, row recorder)           // for CSV
}

// Series is what all kinds of series have: a name for the legend and a look.
type Series struct {
	name  string
	looks look
	err   error
}

func (s *Series) series() *Series { return s }

// Style gives the series the n-th colour, dash and marker, counted from 0, instead of the next free one: for
// a series that stands for the same thing in two panels. There are seven; n beyond begins anew.
func (s *Series) Style(n int) *Series {
	n = ((n % styles) + styles) % styles
	s.looks = look{n, n, n}
	return s
}

// add puts a layer on the panel and picks its look: colours count all series, dashes lines only and markers
// points only, so that each kind begins with its plainest.
func (p *Panel) add(name string, l layer) {
	s := l.series()
	s.name = strings.TrimSpace(plain(name))
	for _, o := range p.layers {
		switch o.(type) {
		case *lineLayer, *Contours:
			s.looks.colour, s.looks.dash = s.looks.colour+1, s.looks.dash+1
		case *Points:
			s.looks.colour, s.looks.marker = s.looks.colour+1, s.looks.marker+1
		}
	}
	s.looks = look{s.looks.colour % styles, s.looks.dash % styles, s.looks.marker % styles}
	p.layers = append(p.layers, l)
}

// Line draws straight lines from point to point. On an axis of categories a nil x means one value a category.
// A name of "" keeps any series out of the legend.
func (p *Panel) Line(name string, x, y []float64) *Series {
	l := &lineLayer{x: slices.Clone(x), y: slices.Clone(y)}
	p.add(name, l)
	return &l.Series
}

// Points draws a marker at each point; x is as for Line.
func (p *Panel) Points(name string, x, y []float64) *Points {
	l := &Points{x: slices.Clone(x), y: slices.Clone(y)}
	p.add(name, l)
	return l
}

// Estimates draws a marker at each estimate and its 95 % interval as a bar; x is as for Line.
func (p *Panel) Estimates(name string, x []float64, y []snubber.Estimate) *Points {
	values, low, high := make([]float64, len(y)), make([]float64, len(y)), make([]float64, len(y))
	for i, e := range y {
		values[i], low[i], high[i] = e.Value, e.Low, e.High
		if e.Low == 0 && e.High == 0 { // no interval stated
			low[i], high[i] = e.Value, e.Value
		}
	}
	return p.Points(name, x, values).Interval95(low, high)
}

// Band fills the area between low and high, such as the uncertainty of a line. It takes the colour of the series
// before it and lies under all series; the name should say what it covers.
func (p *Panel) Band(name string, x, low, high []float64) *Series {
	l := &bandLayer{x: slices.Clone(x), low: slices.Clone(low), high: slices.Clone(high)}
	for _, o := range p.layers {
		switch o.(type) {
		case *lineLayer, *Points:
			l.looks.colour = o.series().looks.colour
		}
	}
	colour := l.looks.colour
	p.add(name, l)
	l.looks.colour = colour
	return &l.Series
}

// Contours draws lines of equal z over a grid, with their values: z[i][j] belongs to x[i] and y[j], both
// ascending. The axis z names and scales the values; its levels are round numbers. The lines are straight within
// the grid's cells: 60 to 120 values each way look smooth.
func (p *Panel) Contours(z Axis, x, y []float64, values [][]float64) *Contours {
	l := &Contours{z: z, x: slices.Clone(x), y: slices.Clone(y), values: make([][]float64, len(values))}
	for i := range values {
		l.values[i] = slices.Clone(values[i])
	}
	p.add(z.name, l)
	return l
}

// Mark draws a target at one point and its name beside it, such as the choice.
func (p *Panel) Mark(name string, x, y float64) { p.add(name, &markLayer{x: x, y: y}) }

// Across draws a horizontal line for reference, such as a limit, with its name.
func (p *Panel) Across(name string, y float64) { p.add(name, &ruleLayer{at: y}) }

// Upright draws a vertical line for reference, such as the ring's frequency, with its name.
func (p *Panel) Upright(name string, x float64) { p.add(name, &ruleLayer{at: x, upright: true}) }

// check gives the first mistake in the plot.
func (p *Plot) check() error {
	if err := p.x.check(); err != nil {
		return fmt.Errorf("plot %q: horizontal axis: %w", p.title, err)
	}
	for _, q := range p.panels() {
		err := q.y.check()
		if q.y.scale == category {
			err = fmt.Errorf("%q has categories; only the horizontal axis can", q.y.name)
		}
		if err != nil {
			return fmt.Errorf("plot %q: vertical axis: %w", p.title, err)
		}
		for i, l := range q.layers {
			err := l.series().err
			if err == nil {
				err = l.check(p.x, q.y)
			}
			if err != nil {
				return fmt.Errorf("plot %q: series %d, %q: %w", p.title, i+1, l.series().name, err)
			}
		}
	}
	return nil
}
