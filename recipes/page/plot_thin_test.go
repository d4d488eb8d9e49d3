package page

import (
	"math"
	"slices"
	"testing"

	"gonum.org/v1/plot/vg"
)

// A single spike among a million samples is on the figure, at its height.
func TestThinningKeepsExtremes(t *testing.T) {
	pts := make([]vg.Point, 1_000_000)
	for i := range pts {
		pts[i] = vg.Point{X: length(i) * 370 / 1e6, Y: length(math.Sin(float64(i) / 5))}
	}
	pts[123_456].Y, pts[654_321].Y = 77, -88
	gap := vg.Point{X: length(math.NaN())}
	for i := 500_000; i < 510_000; i++ {
		pts[i] = gap
	}
	runs := thinLine(slices.Clone(pts), column)
	if len(runs) != 2 {
		t.Fatalf("%d runs, want 2: the gap is lost", len(runs))
	}
	n := 0
	for _, spike := range []int{0, 123_456, 499_999, 510_000, 654_321, 999_999} {
		found := false
		for _, r := range runs {
			found = found || slices.Contains(r, pts[spike])
		}
		if !found {
			t.Errorf("sample %d is lost", spike)
		}
	}
	for _, r := range runs {
		n += len(r)
		if !slices.IsSortedFunc(r, func(a, b vg.Point) int { return int(math.Copysign(1, float64(a.X-b.X))) }) {
			t.Error("the order of samples is lost")
		}
	}
	if n > 4*int(370/column)+8 {
		t.Errorf("%d vertices for %d columns", n, int(370/column))
	}
}

func TestThinningPointsKeepsTheFarthest(t *testing.T) {
	var pts []vg.Point
	for i := range 50_000 {
		pts = append(pts, vg.Point{X: length(i % 300), Y: length(i % 170)})
	}
	pts[40_001] = vg.Point{X: 150.1, Y: 170.3}
	low, high := make([]float64, len(pts)), make([]float64, len(pts))
	high[44_444] = 9
	keep := thinPoints(pts, low, high)
	if len(keep) > 6000 || !slices.Contains(keep, 40_001) || !slices.Contains(keep, 44_444) || !slices.IsSorted(keep) {
		t.Errorf("%d points kept; the highest %v, that with the highest bar %v", len(keep),
			slices.Contains(keep, 40_001), slices.Contains(keep, 44_444))
	}
}

// The whole circle x² + y² = 1 is traced as one closed line on which every point has radius 1.
func TestContourOfACircle(t *testing.T) {
	const n = 61
	at, z := make([][]vg.Point, n), make([][]float64, n)
	for i := range n {
		for j := range n {
			x, y := 4*float64(i)/(n-1)-2, 4*float64(j)/(n-1)-2
			at[i], z[i] = append(at[i], vg.Point{X: length(x * 100), Y: length(y * 100)}), append(z[i], x*x+y*y)
		}
	}
	lines := contour(at, z, 1)
	if len(lines) != 1 || lines[0][0] != lines[0][len(lines[0])-1] {
		t.Fatalf("%d lines, want one closed line", len(lines))
	}
	for _, q := range lines[0] {
		if r := math.Hypot(float64(q.X), float64(q.Y)); math.Abs(r-100) > 0.2 {
			t.Errorf("radius %g of 100", r)
		}
	}
	if l := float64(runLength(lines[0])); math.Abs(l-200*math.Pi) > 1 {
		t.Errorf("length %g, want %g", l, 200*math.Pi)
	}
	box := vg.Rectangle{Min: vg.Point{X: -300, Y: 0}, Max: vg.Point{X: 300, Y: 300}}
	rest := length(0)
	for _, run := range outside(lines[0], []vg.Rectangle{box}) {
		rest += runLength(run)
		for _, q := range run {
			if q.Y > 1e-9 {
				t.Errorf("a point at %v is within the box", q)
			}
		}
	}
	if math.Abs(float64(rest)-100*math.Pi) > 1 {
		t.Errorf("outside the upper half there are %g, want %g", rest, 100*math.Pi)
	}
	// What is no number is not joined across.
	z[30][30], z[2][2] = math.NaN(), math.NaN()
	if lines := contour(at, z, 1); len(lines) != 1 {
		t.Errorf("%d lines on a grid with holes that the line does not touch, want 1", len(lines))
	}
	z[45][30] = math.NaN() // at x = 1, y = 0
	if lines := contour(at, z, 1); len(lines) != 1 || lines[0][0] == lines[0][len(lines[0])-1] || runLength(lines[0]) > 620 {
		t.Errorf("%d lines of %v around a circle with a hole in it, want one that is open", len(lines), runLength(lines[0]))
	}
	saddle := contour([][]vg.Point{{{}, {Y: 100}}, {{X: 100}, {X: 100, Y: 100}}}, [][]float64{{1, 0}, {0, 1}}, 0.5)
	if len(saddle) != 2 {
		t.Errorf("%d lines on a saddle, want 2", len(saddle))
	}
}
