package page

import (
	"math"

	"gonum.org/v1/plot/vg"
)

// contour traces the lines on which z is v over a grid of points, by marching squares: each cell whose corners lie
// on both sides of v is crossed by one or two pieces, which are then joined through the edges they share. Cells
// with a corner that is no number are left out. It is deterministic, which the one of gonum/plot is not.
func contour(at [][]vg.Point, z [][]float64, v float64) [][]vg.Point {
	if len(z) < 2 || len(z[0]) < 2 {
		return nil
	}
	ny := len(z[0])
	// An edge is numbered 2*(i*ny+j) when it leads from node i, j to i+1, j, and one more when to i, j+1.
	edges := 2 * len(z) * ny
	next := make([][2]int, edges) // the one or two edges that pieces join an edge to, plus one
	join := func(a, b int) {
		for _, e := range [][2]int{{a, b}, {b, a}} {
			if next[e[0]][0] == 0 {
				next[e[0]][0] = e[1] + 1
			} else {
				next[e[0]][1] = e[1] + 1
			}
		}
	}
	for i := 0; i+1 < len(z); i++ {
		for j := 0; j+1 < ny; j++ {
			n := 2 * (i*ny + j)
			south, west, north, east := n, n+1, n+2, n+2*ny+1
			a, b, c, d := z[i][j], z[i+1][j], z[i+1][j+1], z[i][j+1]
			if math.IsNaN(a+b+c+d) || math.IsInf(a+b+c+d, 0) {
				continue
			}
			crossed := make([]int, 0, 4) // anticlockwise from the south
			for _, e := range []struct {
				u, w float64
				edge int
			}{{a, b, south}, {b, c, east}, {c, d, north}, {d, a, west}} {
				if (e.u >= v) != (e.w >= v) {
					crossed = append(crossed, e.edge)
				}
			}
			switch {
			case len(crossed) == 2:
				join(crossed[0], crossed[1])
			case len(crossed) == 4 && (a >= v) == ((a+b+c+d)/4 >= v): // a saddle: the middle is on a's side
				join(south, east)
				join(north, west)
			case len(crossed) == 4:
				join(south, west)
				join(north, east)
			}
		}
	}
	crossing := func(e int) vg.Point {
		i, j := e/2/ny, e/2%ny
		i2, j2 := i+1-e%2, j+e%2
		t := (v - z[i][j]) / (z[i2][j2] - z[i][j])
		return at[i][j].Add(at[i2][j2].Sub(at[i][j]).Scale(length(t)))
	}
	var lines [][]vg.Point
	used := make([]bool, edges)
	trace := func(e int) {
		start := e
		var line []vg.Point
		for {
			used[e] = true
			if q := crossing(e); shown(q) {
				line = append(line, q)
			}
			n := -1
			for _, k := range next[e] {
				if k > 0 && !used[k-1] {
					n = k - 1
				}
			}
			if n < 0 {
				break
			}
			e = n
		}
		if e != start && (next[e][0] == start+1 || next[e][1] == start+1) && len(line) > 2 {
			line = append(line, line[0]) // a closed line
		}
		if len(line) > 1 {
			lines = append(lines, slim(line))
		}
	}
	for _, ends := range []bool{true, false} { // open lines from an end, then closed ones from anywhere
		for e := range next {
			if next[e][0] > 0 && !used[e] && (next[e][1] == 0) == ends {
				trace(e)
			}
		}
	}
	return lines
}

// slim leaves out points closer than can be seen to the one before.
func slim(line []vg.Point) []vg.Point {
	out := line[:1]
	for i, q := range line[1:] {
		d := q.Sub(out[len(out)-1])
		if i == len(line)-2 || math.Hypot(float64(d.X), float64(d.Y)) >= 0.8 {
			out = append(out, q)
		}
	}
	return out
}

// outside gives the parts of a line that lie outside all boxes.
func outside(line []vg.Point, boxes []vg.Rectangle) [][]vg.Point {
	var runs [][]vg.Point
	var run []vg.Point
	end := func() {
		if len(run) > 1 {
			runs = append(runs, run)
		}
		run = nil
	}
	for k := 1; k < len(line); k++ {
		a, d := line[k-1], line[k].Sub(line[k-1])
		// The free parts of this piece, as shares of its length.
		free := [][2]float64{{0, 1}}
		for _, box := range boxes {
			from, to, hit := through(a, d, box)
			if !hit {
				continue
			}
			var left [][2]float64
			for _, f := range free {
				if from > f[0] {
					left = append(left, [2]float64{f[0], math.Min(f[1], from)})
				}
				if to < f[1] {
					left = append(left, [2]float64{math.Max(f[0], to), f[1]})
				}
			}
			free = left
		}
		for _, f := range free {
			if f[0] > 0 || run == nil {
				end()
				run = append(run, a.Add(d.Scale(length(f[0]))))
			}
			run = append(run, a.Add(d.Scale(length(f[1]))))
			if f[1] < 1 {
				end()
			}
		}
		if len(free) == 0 {
			end()
		}
	}
	end()
	return runs
}

// through is the part of the line from a along d that lies in the box, as shares of d (Liang and Barsky, ACM
// Transactions on Graphics 3, 1 (1984)).
func through(a, d vg.Point, box vg.Rectangle) (from, to float64, hit bool) {
	from, to = 0, 1
	for _, s := range []struct{ p, d, low, high length }{{a.X, d.X, box.Min.X, box.Max.X}, {a.Y, d.Y, box.Min.Y, box.Max.Y}} {
		if s.d == 0 {
			if s.p < s.low || s.p > s.high {
				return 0, 0, false
			}
			continue
		}
		t1, t2 := float64((s.low-s.p)/s.d), float64((s.high-s.p)/s.d)
		from, to = math.Max(from, math.Min(t1, t2)), math.Min(to, math.Max(t1, t2))
	}
	return from, to, from < to
}
