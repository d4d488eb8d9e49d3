package page

import (
	"fmt"
	"html"
	"image"
	"image/color"
	"math"
	"strconv"

	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// svgCanvas is a drawing surface of gonum.org/v1/plot/vg that writes SVG 1.1 to stand in an HTML page: no fixed
// size, no style attributes (a content security policy may forbid them), no identifiers, ink as currentColor,
// and coordinates in whole hundredths of a point, so that the bytes are the same on every machine. Plots here
// turn nothing but text, so it keeps no transforms: Rotate, Translate and Scale are not for use.
type svgCanvas struct {
	buf    []byte
	height length
	now    svgState
	saved  []svgState
}

type svgState struct {
	colour color.Color
	width  length
	dashes []vg.Length
}

// fontStack is one family's name on different systems; the first three have the same widths.
const fontStack = "Liberation Sans, Arial, Helvetica, sans-serif"

func newSVG(w, h length, alt string) *svgCanvas {
	s := &svgCanvas{height: h}
	s.buf = fmt.Appendf(s.buf, `<svg xmlns="http://www.w3.org/2000/svg" class="plot" viewBox="0 0 %s %s" role="img" aria-label="%s" fill="none" stroke-linejoin="round" font-family="%s" font-size="%d">`+"\n",
		hundredths(w), hundredths(h), html.EscapeString(alt), fontStack, textSize)
	vg.Initialize(s)
	return s
}

func (s *svgCanvas) bytes() []byte { return append(s.buf, "</svg>\n"...) }

func (s *svgCanvas) SetLineWidth(w vg.Length)               { s.now.width = w }
func (s *svgCanvas) SetLineDash(d []vg.Length, _ vg.Length) { s.now.dashes = d }
func (s *svgCanvas) SetColor(c color.Color)                 { s.now.colour = c }
func (s *svgCanvas) Push()                                  { s.saved = append(s.saved, s.now) }
func (s *svgCanvas) Rotate(float64)                         {}
func (s *svgCanvas) Translate(vg.Point)                     {}
func (s *svgCanvas) Scale(float64, float64)                 {}
func (s *svgCanvas) DrawImage(vg.Rectangle, image.Image)    {}

// FillString is for text that nobody aligned; see svgText.
func (s *svgCanvas) FillString(f font.Face, at vg.Point, t string) {
	s.text(t, text.Style{Color: s.now.colour, Font: f.Font}, at)
}

func (s *svgCanvas) Pop() {
	if n := len(s.saved); n > 0 {
		s.now, s.saved = s.saved[n-1], s.saved[:n-1]
	}
}

func (s *svgCanvas) Stroke(p vg.Path) {
	if s.now.width <= 0 || len(p) == 0 {
		return
	}
	s.buf = append(s.buf, "<path "...)
	s.paint("stroke")
	s.buf = append(s.buf, ` stroke-width="`+hundredths(s.now.width)+`"`...)
	for i, d := range s.now.dashes {
		if i == 0 {
			s.buf = append(s.buf, ` stroke-dasharray="`...)
		} else {
			s.buf = append(s.buf, ' ')
		}
		s.buf = append(s.buf, hundredths(d)...)
		if i == len(s.now.dashes)-1 {
			s.buf = append(s.buf, '"')
		}
	}
	s.path(p)
}

func (s *svgCanvas) Fill(p vg.Path) {
	if len(p) == 0 {
		return
	}
	s.buf = append(s.buf, "<path "...)
	s.paint("fill")
	s.path(p)
}

// paint writes the colour as a presentation attribute.
func (s *svgCanvas) paint(attribute string) {
	c, _ := color.NRGBAModel.Convert(s.now.colour).(color.NRGBA)
	value := "currentColor"
	if c.R|c.G|c.B != 0 {
		value = fmt.Sprintf("#%02x%02x%02x", c.R, c.G, c.B)
	}
	s.buf = fmt.Appendf(s.buf, `%s="%s"`, attribute, value)
	if c.A != 255 {
		s.buf = fmt.Appendf(s.buf, ` %s-opacity="%s"`, attribute, hundredths(length(c.A)/255))
	}
}

// path writes a path with relative coordinates, which are short. They are differences of rounded absolute ones, so
// that no error adds up.
func (s *svgCanvas) path(p vg.Path) {
	s.buf = append(s.buf, ` d="`...)
	var x, y, startX, startY int
	last := byte(0)
	number := func(n int, first bool) {
		if !first && n >= 0 {
			s.buf = append(s.buf, ' ')
		}
		s.buf = appendHundredths(s.buf, n)
	}
	to := func(command byte, q vg.Point) {
		nx, ny := whole(q.X), whole(s.height-q.Y)
		switch {
		case command == 'l' && ny == y && last != 'l':
			s.buf = append(s.buf, 'h')
			number(nx-x, true)
			last = 'h'
		case command == 'l' && nx == x && last != 'l':
			s.buf = append(s.buf, 'v')
			number(ny-y, true)
			last = 'v'
		case command == 'l':
			if last != 'l' {
				s.buf = append(s.buf, 'l')
			}
			number(nx-x, last != 'l')
			number(ny-y, false)
			last = 'l'
		default:
			s.buf = append(s.buf, 'M')
			number(nx, true)
			number(ny, false)
			startX, startY, last = nx, ny, 'M'
		}
		x, y = nx, ny
	}
	for _, c := range p {
		switch c.Type {
		case vg.MoveComp:
			to('M', c.Pos)
		case vg.LineComp:
			to('l', c.Pos)
		case vg.ArcComp: // whole circles only, begun at their right
			r := hundredths(c.Radius)
			d := whole(2 * c.Radius)
			half := "a" + r + " " + r + " 0 1 0 "
			s.buf = append(s.buf, half...)
			s.buf = append(appendHundredths(s.buf, -d), " 0"...)
			s.buf = append(s.buf, half...)
			s.buf = append(appendHundredths(s.buf, d), " 0"...)
			last = 'a'
		case vg.CloseComp:
			s.buf = append(s.buf, 'z')
			x, y, last = startX, startY, 'z'
		}
	}
	s.buf = append(s.buf, "\"/>\n"...)
}

// svgText draws text on an svgCanvas as text that is anchored where it was to be aligned: a reader without the
// typeface still sees centred labels centred. On other surfaces it is gonum's own.
type svgText struct{ text.Plain }

func (h svgText) Draw(c vg.Canvas, txt string, sty text.Style, pt vg.Point) {
	under := c
	for { // gonum wraps a canvas for each part of a figure
		switch w := under.(type) {
		case *draw.Canvas:
			under = w.Canvas
			continue
		case draw.Canvas:
			under = w.Canvas
			continue
		case *svgCanvas:
			up := sty.Height(txt)*length(sty.YAlign) - h.Extents(sty.Font).Ascent + sty.Font.Size
			sin, cos := math.Sincos(sty.Rotation)
			w.text(txt, sty, pt.Add(vg.Point{X: -up * length(sin), Y: up * length(cos)}))
			return
		}
		h.Plain.Draw(c, txt, sty, pt)
		return
	}
}

// text writes text with its base line at a point.
func (s *svgCanvas) text(t string, sty text.Style, at vg.Point) {
	if t == "" {
		return
	}
	x, y := hundredths(at.X), hundredths(s.height-at.Y)
	s.buf = fmt.Appendf(s.buf, `<text x="%s" y="%s"`, x, y)
	if sty.Rotation != 0 {
		s.buf = fmt.Appendf(s.buf, ` transform="rotate(%s %s %s)"`, hundredths(length(-sty.Rotation*180/math.Pi)), x, y)
	}
	switch sty.XAlign {
	case text.XCenter:
		s.buf = append(s.buf, ` text-anchor="middle"`...)
	case text.XRight:
		s.buf = append(s.buf, ` text-anchor="end"`...)
	}
	if sty.Font.Size != textSize {
		s.buf = fmt.Appendf(s.buf, ` font-size="%s"`, hundredths(sty.Font.Size))
	}
	s.buf = append(s.buf, ' ')
	s.now.colour = sty.Color
	s.paint("fill")
	s.buf = append(s.buf, '>')
	s.buf = append(s.buf, html.EscapeString(t)...)
	s.buf = append(s.buf, "</text>\n"...)
}

// whole is a coordinate in whole hundredths. What is far off the sheet stays there without overflow.
func whole(v length) int {
	return int(math.Round(100 * math.Max(-1e6, math.Min(1e6, float64(v)))))
}

func hundredths(v length) string { return string(appendHundredths(nil, whole(v))) }

func appendHundredths(b []byte, n int) []byte {
	if n < 0 {
		b = append(b, '-')
		n = -n
	}
	if n >= 100 || n == 0 {
		b = strconv.AppendInt(b, int64(n/100), 10)
	}
	if n%100 == 0 {
		return b
	}
	b = append(b, '.', byte('0'+n%100/10))
	if n%10 != 0 {
		b = append(b, byte('0'+n%10))
	}
	return b
}
