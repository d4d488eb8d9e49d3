package preferred

import (
	"fmt"
	"math"
)

// The range in which values are found: no resistor, capacitor or inductor lies outside, and inside it every
// value is one exact integer times or over one exact power of ten, thus correctly rounded.
const (
	least = 1e-18
	most  = 1e18
)

// same is the relative distance within which a wanted value counts as equal to a value of the series. It
// covers the rounding of a calculation, and is far below any step (0.5 % in E192).
const same = 1e-9

// Nearest is the value of the series nearest to v, by ratio: the one whose logarithm is nearest. Of two equally
// near, it is the smaller.
//
// v is to lie between 1e-18 and 1e18; zero, a negative number, NaN and infinity are errors, as is a Series that
// does not exist. So it is for Above, Below and Between.
func (s Series) Nearest(v float64) (float64, error) {
	g, err := s.grid("nearest to", v)
	if err != nil {
		return 0, err
	}
	i := g.atOrBelow(v)
	below, above := g.at(i), g.at(i+1)
	if above/v < v/below {
		return above, nil
	}
	return below, nil
}

// Above is the smallest value of the series that is not below v; v itself, within 1e-9 of its size, is its own
// answer.
func (s Series) Above(v float64) (float64, error) {
	g, err := s.grid("at or above", v)
	if err != nil {
		return 0, err
	}
	return g.at(g.atOrAbove(v)), nil
}

// Below is the largest value of the series that is not above v; v itself, within 1e-9 of its size, is its own
// answer.
func (s Series) Below(v float64) (float64, error) {
	g, err := s.grid("at or below", v)
	if err != nil {
		return 0, err
	}
	return g.at(g.atOrBelow(v)), nil
}

// Between lists the values of the series from lo to hi in rising order, both ends included within 1e-9 of their
// size. The list is empty where no value lies between; lo above hi is an error.
func (s Series) Between(lo, hi float64) ([]float64, error) {
	g, err := s.grid("from", lo)
	if err != nil {
		return nil, err
	}
	if _, err := s.grid("up to", hi); err != nil {
		return nil, err
	}
	if lo > hi {
		return nil, fmt.Errorf("%v values from %g to %g: the first is above the second; exchange them", s, lo, hi)
	}
	first, last := g.atOrAbove(lo), g.atOrBelow(hi)
	values := make([]float64, 0, max(0, last-first+1))
	for i := first; i <= last; i++ {
		values = append(values, g.at(i))
	}
	return values, nil
}

// grid is a series laid out over all decades: place i holds the value i steps above 1.
type grid struct {
	list         []int
	step, digits int
	perDecade    int
}

// grid checks s and v for a search, which the error names.
func (s Series) grid(search string, v float64) (grid, error) {
	list, step, digits, ok := s.table()
	switch {
	case !ok:
		return grid{}, fmt.Errorf("series %d: there is no such series; choose one of E3, E6, E12, E24, E48, E96, E192", int(s))
	case !(v >= least && v <= most):
		return grid{}, fmt.Errorf("%v value %s %g: it is to be a number between %g and %g, in the SI unit", s, search, v, least, most)
	}
	return grid{list, step, digits, int(s)}, nil
}

// at is the value at place i.
func (g grid) at(i int) float64 {
	decade := i / g.perDecade
	if i%g.perDecade < 0 {
		decade--
	}
	mantissa := float64(g.list[(i-decade*g.perDecade)*g.step])
	// Powers of ten up to 1e22 are exact, so that one operation rounds once and correctly.
	power := decade - (g.digits - 1)
	if power < 0 {
		return mantissa / math.Pow10(-power)
	}
	return mantissa * math.Pow10(power)
}

// atOrBelow is the place of the largest value not above v.
func (g grid) atOrBelow(v float64) int {
	// The logarithm comes within a place or two: the series are rounded powers.
	i := int(math.Floor(math.Log10(v) * float64(g.perDecade)))
	for g.at(i) > v*(1+same) {
		i--
	}
	for g.at(i+1) <= v*(1+same) {
		i++
	}
	return i
}

// atOrAbove is the place of the smallest value not below v.
func (g grid) atOrAbove(v float64) int {
	i := g.atOrBelow(v)
	if g.at(i) < v*(1-same) {
		i++
	}
	return i
}
