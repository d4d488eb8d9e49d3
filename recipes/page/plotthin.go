package page

import (
	"math"

	"gonum.org/v1/plot/vg"
)

// column is the width within which samples of a line cannot be told apart: about a dot at 150 dots per inch.
const column = length(0.5)

// mostVertices is how many a line may have in the end, whatever its shape.
const mostVertices = 12000

// thinLine splits a line at its gaps, which are points with NaN, and keeps of each column's consecutive samples
// the first, the last, the lowest and the highest, so that no peak is lost. A gap within a column is not seen.
// Short lines are kept whole.
func thinLine(pts []vg.Point, column length) [][]vg.Point {
	if len(pts) <= 1500 {
		return split(pts)
	}
	var runs [][]vg.Point
	total := 0
	var run, group []vg.Point
	flush := func() {
		run = appendExtremes(run, group)
		group = group[:0]
	}
	cell, gap := 0, false
	for _, p := range pts {
		if !shown(p) {
			gap = true
			continue
		}
		c := int(math.Floor(float64(p.X / column)))
		if len(group) > 0 && c != cell {
			flush()
			if gap {
				runs, total = append(runs, run), total+len(run)
				run = nil
			}
		}
		cell, gap = c, false
		group = append(group, p)
	}
	flush()
	if len(run) > 0 {
		runs, total = append(runs, run), total+len(run)
	}
	if total <= mostVertices {
		return runs
	}
	return [][]vg.Point{coarse(pts)}
}

// split splits a line at its gaps.
func split(pts []vg.Point) (runs [][]vg.Point) {
	var run []vg.Point
	for _, p := range pts {
		if shown(p) {
			run = append(run, p)
		} else if run != nil {
			runs, run = append(runs, run), nil
		}
	}
	if run != nil {
		runs = append(runs, run)
	}
	return runs
}

// coarse is for a line that runs to and fro: extremes of so many samples each.
func coarse(pts []vg.Point) []vg.Point {
	var group, out []vg.Point
	n := 1 + len(pts)*6/mostVertices
	for _, p := range pts {
		if shown(p) {
			group = append(group, p)
		}
		if len(group) == n {
			out, group = appendExtremes(out, group), group[:0]
		}
	}
	return appendExtremes(out, group)
}

// appendExtremes appends the first, last, lowest, highest, leftmost and rightmost of the group, in its order.
func appendExtremes(out, group []vg.Point) []vg.Point {
	if len(group) <= 4 {
		return append(out, group...)
	}
	var low, high, left, right int
	for i, p := range group {
		if p.Y < group[low].Y {
			low = i
		}
		if p.Y > group[high].Y {
			high = i
		}
		if p.X < group[left].X {
			left = i
		}
		if p.X > group[right].X {
			right = i
		}
	}
	if group[right].X-group[left].X <= column { // a column: its ends in x do not show
		left, right = 0, 0
	}
	for i, p := range group {
		switch i {
		case 0, len(group) - 1, low, high, left, right:
			out = append(out, p)
		}
	}
	return out
}

// thinPoints gives the indices of the points to draw, in order: all of a few, else one for each place on the
// sheet, and always those that reach farthest.
func thinPoints(pts []vg.Point, low, high []float64) []int {
	var all []int
	for i, p := range pts {
		if shown(p) {
			all = append(all, i)
		}
	}
	if len(all) <= manyPoints {
		return all
	}
	keep := make(map[int]bool)
	for _, v := range []func(i int) float64{
		func(i int) float64 { return float64(pts[i].X) },
		func(i int) float64 { return float64(pts[i].Y) },
		func(i int) float64 { return at(high, i) },
		func(i int) float64 { return -at(low, i) },
	} {
		first, last := all[0], all[0]
		for _, i := range all {
			if v(i) < v(first) {
				first = i
			}
			if v(i) > v(last) {
				last = i
			}
		}
		keep[first], keep[last] = true, true
	}
	for side := length(0.5); ; side *= 1.5 {
		type place struct{ x, y int }
		taken := make(map[place]bool)
		var out []int
		for _, i := range all {
			c := place{int(math.Floor(float64(pts[i].X / side))), int(math.Floor(float64(pts[i].Y / side)))}
			if keep[i] || !taken[c] {
				out = append(out, i)
			}
			taken[c] = true
		}
		if len(out) <= 6000 {
			return out
		}
	}
}

// at is v[i], or 0 where there is none.
func at(v []float64, i int) float64 {
	if i < len(v) && !math.IsNaN(v[i]) {
		return v[i]
	}
	return 0
}
