package page

import (
	"image/color"
	"math"

	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// length is a length on the figure, in points of 1/72 inch.
type length = vg.Length

// Sizes of a figure. Text is 10 pt, and 9 pt within the axes, at 150 mm; a column of 80 mm still shows it at 5 pt.
const (
	figureWidth  = 150 * vg.Millimeter
	figureHeight = 95 * vg.Millimeter
	lowerHeight  = 38 * vg.Millimeter // of each further panel; what is above it becomes a little lower
	textSize     = 10
	smallSize    = 9
	thin         = length(0.6) // axes
	stroke       = length(1.3) // lines
	radius       = length(2.7) // markers
)

// ink is the colour of the text around the figure: black on paper, and whatever the page has in SVG.
var ink = color.NRGBA{A: 255}

// styles is how many looks are told apart.
const styles = 7

// look picks the colour, the dash and the marker of a series.
type look struct{ colour, dash, marker int }

// paint is from the palette of M. Okabe and K. Ito, "Color Universal Design", 2008, from memory, without its yellow, which
// no thin line shows on white. Neighbours also differ in lightness.
func (l look) paint() color.NRGBA {
	return [styles]color.NRGBA{
		ink,
		{0xD5, 0x5E, 0x00, 255}, // vermilion
		{0x00, 0x72, 0xB2, 255}, // blue
		{0x00, 0x9E, 0x73, 255}, // bluish green
		{0xCC, 0x79, 0xA7, 255}, // reddish purple
		{0xE6, 0x9F, 0x00, 255}, // orange
		{0x56, 0xB4, 0xE9, 255}, // sky blue
	}[l.colour]
}

// line is the look of a line: the dashes tell lines apart without colour.
func (l look) line(w length) draw.LineStyle {
	return draw.LineStyle{Color: l.paint(), Width: w, Dashes: [styles][]vg.Length{
		nil, {6, 3}, {1.5, 2.2}, {9, 2.5, 1.5, 2.5}, {3, 2}, {9, 2, 1.5, 2, 1.5, 2}, {14, 3},
	}[l.dash]}
}

// faint is c as a veil, for bands and grids.
func faint(c color.NRGBA, alpha uint8) color.NRGBA {
	c.A = alpha
	return c
}

// addMarker adds the marker at a point to a path; filled says whether the path is to be filled or stroked.
func (l look) addMarker(p *vg.Path, at vg.Point) (filled bool) {
	polygon := func(r length, corners ...float64) {
		for i, a := range corners {
			sin, cos := math.Sincos(a * math.Pi / 180)
			q := vg.Point{X: at.X + r*length(cos), Y: at.Y + r*length(sin)}
			if i == 0 {
				p.Move(q)
			} else {
				p.Line(q)
			}
		}
		p.Close()
	}
	bar := func(dx, dy length) {
		p.Move(vg.Point{X: at.X - dx, Y: at.Y - dy})
		p.Line(vg.Point{X: at.X + dx, Y: at.Y + dy})
	}
	switch l.marker {
	case 0:
		p.Move(vg.Point{X: at.X + radius, Y: at.Y})
		p.Arc(at, radius, 0, 2*math.Pi)
		p.Close()
	case 1:
		polygon(radius*1.25, 45, 135, 225, 315)
	case 2:
		polygon(radius*1.35, 90, 210, 330)
	case 3:
		polygon(radius*1.35, 0, 90, 180, 270)
	case 4:
		polygon(radius*1.35, 30, 150, 270)
	case 5:
		bar(radius, radius)
		bar(radius, -radius)
		return false
	default:
		bar(radius*1.2, 0)
		bar(0, radius*1.2)
		return false
	}
	return true
}

// typeface is Liberation Sans, which has the widths of Arial and Helvetica.
func typeface(size length) font.Font {
	return font.Font{Typeface: "Liberation", Variant: "Sans", Size: size}
}
