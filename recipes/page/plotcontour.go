package page

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
)

// Contours are lines of equal value over a grid.
type Contours struct {
	Series
	z      Axis
	x, y   []float64
	values [][]float64
	levels []float64
}

// Levels draws the lines at these values (SI) instead of at round ones: one level draws a limit.
func (s *Contours) Levels(values ...float64) *Contours {
	s.levels = slices.Clone(values)
	return s
}

func (s *Contours) check(x, y Axis) error {
	if x.scale == category {
		return fmt.Errorf("contours over %q, an axis of categories; they need numbers", x.name)
	}
	if len(s.values) != len(s.x) {
		return fmt.Errorf("%d columns of values for %d values of x; give as many", len(s.values), len(s.x))
	}
	for i, column := range s.values {
		if len(column) != len(s.y) {
			return fmt.Errorf("column %d has %d values for %d values of y; give as many", i, len(column), len(s.y))
		}
		if err := s.z.checkValues(column); err != nil {
			return err
		}
	}
	if !ascending(s.x) || !ascending(s.y) {
		return fmt.Errorf("the grid's x or y does not ascend; sort the grid")
	}
	if err := x.checkValues(s.x); err != nil {
		return err
	}
	if err := y.checkValues(s.y); err != nil {
		return err
	}
	return s.z.check()
}

func (s *Contours) extent(x, y *reach) {
	if s.reach().any {
		x.see(s.x...)
		y.see(s.y...)
	}
}

// reach is the range of the values.
func (s *Contours) reach() reach {
	var r reach
	for _, column := range s.values {
		r.see(column...)
	}
	return r
}

// level is one contour's value and label.
type level struct {
	value float64
	label string
}

// chosen gives the levels: those asked for, or about seven round ones between the least and the largest value. A
// grid of one value has none.
func (s *Contours) chosen() []level {
	r := s.reach()
	if s.levels == nil && (!r.any || r.high-r.low <= 1e-9*math.Max(math.Abs(r.low), math.Abs(r.high))) {
		return nil
	}
	for _, v := range s.levels {
		r.see(v)
	}
	factor, symbol := s.z.shown(math.Max(math.Abs(r.low), math.Abs(r.high)))
	unit := scale{factor, symbol}
	var out []level
	if s.levels != nil {
		for _, v := range s.levels {
			if plottable(v) {
				out = append(out, level{v, unit.withUnit(tickText(v * factor))})
			}
		}
		return out
	}
	ruler := newRuler(s.z, r, func(string) float64 { return 0.12 })
	for _, t := range ruler.ticks {
		if v := ruler.value(t.at); t.label != "" && v > r.low && v < r.high {
			out = append(out, level{v, unit.withUnit(t.label)})
		}
	}
	return out
}

// value is what lies at a place along the axis: the inverse of at.
func (r *ruler) value(at float64) float64 {
	v := r.low + at*(r.high-r.low)
	if r.axis.scale == logarithmic {
		return math.Pow(10, v)
	}
	return v
}

// mostNodes is how many lines of the grid are used in each direction; a finer grid is thinned.
const mostNodes = 150

func (s *Contours) draw(p *pane) {
	nx, ny := thinned(len(s.x)), thinned(len(s.y))
	at := make([][]vg.Point, len(nx))
	z := make([][]float64, len(nx))
	for i, a := range nx {
		at[i], z[i] = make([]vg.Point, len(ny)), make([]float64, len(ny))
		for j, b := range ny {
			at[i][j], z[i][j] = p.at(s.x[a], s.y[b]), s.values[a][b]
			if s.z.scale == logarithmic {
				z[i][j] = math.Log10(z[i][j])
			}
		}
	}
	for _, l := range s.chosen() {
		v := l.value
		if s.z.scale == logarithmic {
			v = math.Log10(v)
		}
		lines := contour(at, z, v)
		for _, line := range lines {
			for i := 1; i < len(line); i++ {
				p.busy.line(line[i-1], line[i])
			}
		}
		p.later = append(p.later, func() { p.labelContour(lines, l.label) })
		p.last = append(p.last, func() {
			var runs [][]vg.Point
			for _, line := range lines {
				runs = append(runs, outside(line, p.labels)...)
			}
			p.strokeRuns(s.looks.line(stroke*0.8), runs)
		})
	}
}

// thinned is the indices of the grid lines used: all of few, else about mostNodes of them with both ends.
func thinned(n int) []int {
	every := max(1, int(math.Ceil(float64(n)/mostNodes)))
	var out []int
	for i := 0; i < n; i += every {
		out = append(out, i)
	}
	if n > 0 && out[len(out)-1] != n-1 {
		out = append(out, n-1)
	}
	return out
}

// labelContour puts the value on the longest of a level's lines, where there is most room.
func (p *pane) labelContour(lines [][]vg.Point, label string) {
	var longest []vg.Point
	most := length(40) // too short to carry a label
	for _, line := range lines {
		if l := runLength(line); l > most {
			longest, most = line, l
		}
	}
	if longest == nil {
		return
	}
	half := vg.Point{X: p.width(label, smallSize) / 2, Y: smallSize * 1.15 / 2}
	inner := vg.Rectangle{Min: p.Min.Add(half).Add(vg.Point{X: 4, Y: 4}), Max: p.Max.Sub(half).Sub(vg.Point{X: 4, Y: 4})}
	var inside, all []spot
	for _, share := range []length{0.5, 0.4, 0.6, 0.3, 0.7, 0.2, 0.8, 0.1, 0.9, 0.05, 0.95} {
		q := along(longest, share*most)
		s := spot{q.Sub(half), text.XCenter}
		all = append(all, s)
		if q.X > inner.Min.X && q.X < inner.Max.X && q.Y > inner.Min.Y && q.Y < inner.Max.Y {
			inside = append(inside, s)
		}
	}
	if inside == nil { // a line close to the edge
		inside = all
	}
	p.place(label, inside)
}

func runLength(line []vg.Point) length {
	l := length(0)
	for i := 1; i < len(line); i++ {
		d := line[i].Sub(line[i-1])
		l += length(math.Hypot(float64(d.X), float64(d.Y)))
	}
	return l
}

// along is the point so far along the line.
func along(line []vg.Point, far length) vg.Point {
	for i := 1; i < len(line); i++ {
		d := line[i].Sub(line[i-1])
		l := length(math.Hypot(float64(d.X), float64(d.Y)))
		if l >= far && l > 0 {
			return line[i-1].Add(d.Scale(far / l))
		}
		far -= l
	}
	return line[len(line)-1]
}

func (s *Contours) swatch(c *sheet, at vg.Point, w length) { swatchLine(c, s.looks, at, w) }
