package leastsq

import (
	"fmt"
	"math"
	"slices"
)

// frame is the origin and the unit in which the points of a line are of size one, so that no square of theirs leaves a
// float64. The units are powers of two, which round nothing.
type frame struct{ x0, y0, x, y float64 }

// linePoints checks the points of a line and puts them into a frame of their own.
func linePoints(x, y, ux, uy, corr []float64) (*points, frame, error) {
	if err := checkLine(x, y, ux, uy, corr); err != nil {
		return nil, frame{}, err
	}
	var f frame
	f.x0, f.x = middle(x)
	f.y0, f.y = middle(y)
	ps := &points{p: make([]linePoint, len(x))}
	var largest float64 // uncertainty in the frame
	for i := range x {
		largest = max(largest, at(ux, i)/f.x, at(uy, i)/f.y)
	}
	_, e := math.Frexp(largest)
	unit := math.Ldexp(1, e)
	ps.unit = unit
	for i := range x {
		sx, sy := at(ux, i)/f.x/unit, at(uy, i)/f.y/unit
		ps.p[i] = linePoint{
			x: (x[i] - f.x0) / f.x, y: (y[i] - f.y0) / f.y,
			vx: sx * sx, vy: sy * sy, c: at(corr, i) * sx * sy,
		}
	}
	return ps, f, nil
}

// middle gives the middle of the values and the power of two next above half their spread; the spread of equal
// values counts as one.
func middle(v []float64) (origin, unit float64) {
	low, high := slices.Min(v), slices.Max(v)
	half := high/2 - low/2
	if half == 0 {
		return low, 1
	}
	_, e := math.Frexp(half)
	return low + half, math.Ldexp(1, e)
}

func at(v []float64, i int) float64 {
	if v == nil {
		return 0
	}
	return v[i]
}

func checkLine(x, y, ux, uy, corr []float64) error {
	n := len(x)
	if len(y) != n {
		return fmt.Errorf("%d values of x but %d of y: give as many of each", n, len(y))
	}
	for _, l := range []struct {
		what string
		v    []float64
	}{{"uncertainties of x", ux}, {"uncertainties of y", uy}, {"correlations", corr}} {
		if l.v != nil && len(l.v) != n {
			return fmt.Errorf("%d %s for %d points: give one for each, or none at all", len(l.v), l.what, n)
		}
	}
	if n < 2 {
		return fmt.Errorf("%d points: a line needs two at least", n)
	}
	for i := range n {
		switch {
		case !finite(x[i]) || !finite(y[i]):
			return fmt.Errorf("point %d is (%g, %g): leave it out or give numbers", i, x[i], y[i])
		case !(at(ux, i) >= 0) || !finite(at(ux, i)):
			return fmt.Errorf("point %d has the uncertainty %g in x: it must be zero or a positive, finite number", i, at(ux, i))
		case !(at(uy, i) >= 0) || !finite(at(uy, i)):
			return fmt.Errorf("point %d has the uncertainty %g in y: it must be zero or a positive, finite number", i, at(uy, i))
		case at(ux, i) == 0 && at(uy, i) == 0:
			return fmt.Errorf("point %d (%g, %g) has no uncertainty in either coordinate: state one of them", i, x[i], y[i])
		case !(math.Abs(at(corr, i)) <= 1):
			return fmt.Errorf("point %d has the correlation %g: it must lie from -1 to 1", i, at(corr, i))
		}
	}
	if slices.Min(x) == slices.Max(x) {
		return fmt.Errorf("every x is %g: a slope needs points at different x", x[0])
	}
	return nil
}
