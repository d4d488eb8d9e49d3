package preferred_test

import (
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	. "ringbook/snubber/preferred"
)

func TestFind(t *testing.T) {
	for _, c := range []struct {
		s                     Series
		v                     float64
		below, nearest, above float64
	}{
		{E12, 2.2e-9, 2.2e-9, 2.2e-9, 2.2e-9},
		{E12, 500e-12, 470e-12, 470e-12, 560e-12},
		{E6, 100e-12, 100e-12, 100e-12, 100e-12},
		{E6, 99e-12, 68e-12, 100e-12, 100e-12},
		{E3, 10, 10, 10, 10}, {E3, 48, 47, 47, 100}, {E3, 5, 4.7, 4.7, 10}, {E3, 7, 4.7, 10, 10},
		{E24, 7.9, 7.5, 8.2, 8.2}, {E24, 7.8, 7.5, 7.5, 8.2}, // by ratio the middle is sqrt(7.5 * 8.2) = 7.842
		{E6, 12.3, 10, 15, 15}, {E6, 12.2, 10, 10, 15}, // sqrt(150) = 12.247, though 12.3 is nearer to 10 by difference
		{E192, 9.25, 9.20, 9.20, 9.31}, {E96, 27, 26.7, 26.7, 27.4},
		// Within 1e-9 of a value is the value; beyond it is not.
		{E12, 2.2e-9 * (1 + 5e-10), 2.2e-9, 2.2e-9, 2.2e-9}, {E12, 2.2e-9 * (1 - 5e-10), 2.2e-9, 2.2e-9, 2.2e-9},
		{E12, 2.2e-9 * (1 + 2e-9), 2.2e-9, 2.2e-9, 2.7e-9}, {E12, 2.2e-9 * (1 - 2e-9), 1.8e-9, 2.2e-9, 2.2e-9},
		{E12, 1e-18, 1e-18, 1e-18, 1e-18}, {E12, 1e18, 1e18, 1e18, 1e18},
		// Of two equally near the smaller: the middle as a float64 has it.
		{E3, math.Sqrt(10 * 22), 10, 10, 22},
	} {
		for name, pair := range map[string]struct {
			find func(float64) (float64, error)
			want float64
		}{"Below": {c.s.Below, c.below}, "Nearest": {c.s.Nearest, c.nearest}, "Above": {c.s.Above, c.above}} {
			if got, err := pair.find(c.v); err != nil || got != pair.want {
				t.Errorf("%v.%s(%v) = %v, %v; want %v", c.s, name, c.v, got, err, pair.want)
			}
		}
	}
}

func TestBetween(t *testing.T) {
	for _, c := range []struct {
		s      Series
		lo, hi float64
		want   []float64
	}{
		{E6, 100e-12, 2.2e-9, []float64{1e-10, 1.5e-10, 2.2e-10, 3.3e-10, 4.7e-10, 6.8e-10, 1e-9, 1.5e-9, 2.2e-9}},
		{E12, 4.6, 6.9, []float64{4.7, 5.6, 6.8}},
		{E3, 11, 21, []float64{}},
		{E12, 47, 47, []float64{47}},
		{E12, 47 * (1 + 5e-10), 56 * (1 - 5e-10), []float64{47, 56}},
		{E12, 47 * (1 + 2e-9), 56 * (1 - 2e-9), []float64{}},
		{E24, 0.82, 1.2, []float64{0.82, 0.91, 1, 1.1, 1.2}},
	} {
		got, err := c.s.Between(c.lo, c.hi)
		if diff := cmp.Diff(c.want, got); err != nil || diff != "" {
			t.Errorf("%v from %v to %v: %v (-want +got):\n%s", c.s, c.lo, c.hi, err, diff)
		}
	}
}

func TestFindRefuses(t *testing.T) {
	for _, v := range []float64{0, math.Copysign(0, -1), -1, math.NaN(), math.Inf(1), math.Inf(-1), 9e-19, 1.1e18, 5e-324} {
		for _, find := range []func(float64) (float64, error){
			E12.Nearest, E12.Above, E12.Below,
			func(v float64) (float64, error) { _, err := E12.Between(v, 1); return 0, err },
			func(v float64) (float64, error) { _, err := E12.Between(1, v); return 0, err },
		} {
			got, err := find(v)
			if err == nil || got != 0 || !strings.Contains(err.Error(), fmt.Sprintf(" %g: it is to be a number between", v)) {
				t.Errorf("%v: %v, %v", v, got, err)
			}
		}
	}
	for _, s := range []Series{0, 1, 13, -3, 384} {
		if _, err := s.Nearest(1); err == nil || !strings.Contains(err.Error(), "no such series") || s.Values() != nil {
			t.Errorf("series %d: %v", int(s), err)
		}
	}
	if _, err := E12.Between(2, 1); err == nil || !strings.Contains(err.Error(), "E12 values from 2 to 1") {
		t.Errorf("ends exchanged: %v", err)
	}
}

// Every value, in every decade, is the float64 that the decimal literal is.
func TestValuesAreExactDecimals(t *testing.T) {
	for _, s := range All() {
		all, err := s.Between(1e-18, 1e18)
		if err != nil {
			t.Fatal(err)
		}
		if want := 36*int(s) + 1; len(all) != want {
			t.Fatalf("%v: %d values; want %d", s, len(all), want)
		}
		mantissas := s.Values()
		scale := len(strconv.Itoa(mantissas[0])) - 1
		for i, got := range all {
			text := fmt.Sprintf("%de%d", mantissas[i%int(s)], i/int(s)-18-scale)
			if want, _ := strconv.ParseFloat(text, 64); got != want {
				t.Fatalf("%v place %d: %v; want %s", s, i, got, text)
			}
		}
		if !sort.Float64sAreSorted(all) {
			t.Errorf("%v is out of order", s)
		}
	}
	if v, _ := E12.Nearest(2.2e-9); v != 2.2e-9 {
		t.Errorf("2.2e-9 is %v", v)
	}
}

// Below, Nearest, Above and Between agree with one another, and no step is wider than the series allow.
func TestNeighbours(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.SampledFrom(All()).Draw(t, "series")
		v := math.Pow(10, rapid.Float64Range(-17.9, 17.9).Draw(t, "log v"))
		below, err1 := s.Below(v)
		above, err2 := s.Above(v)
		nearest, err3 := s.Nearest(v)
		if err1 != nil || err2 != nil || err3 != nil {
			t.Fatal(err1, err2, err3)
		}
		if below > v*(1+1e-9) || above < v*(1-1e-9) {
			t.Fatalf("%v is not between %v and %v", v, below, above)
		}
		if nearest != below && nearest != above {
			t.Fatalf("nearest %v is neither %v nor %v", nearest, below, above)
		}
		dist := func(x float64) float64 { return math.Abs(math.Log(x / v)) }
		if d := dist(nearest); d > dist(below)+1e-15 || d > dist(above)+1e-15 {
			t.Fatalf("nearest to %v is %v, of %v and %v", v, nearest, below, above)
		}
		between, err := s.Between(below, above)
		want := []float64{below, above}
		if below == above {
			want = want[:1]
		}
		if diff := cmp.Diff(want, between); err != nil || diff != "" {
			t.Fatalf("between neighbours (-want +got):\n%s", diff)
		}
		// The widest step of any series is E3's from 10 to 22.
		if above/below > 2.2*(1+1e-12) {
			t.Fatalf("gap from %v to %v", below, above)
		}
		// A decade up holds the same values.
		if v < 1e17 {
			up, err := s.Above(above * 10)
			if err != nil || math.Abs(up/above-10) > 1e-14 {
				t.Fatalf("ten times %v is %v, %v", above, up, err)
			}
		}
	})
}

// A larger wish never gets a smaller part.
func TestFindIsMonotonic(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.SampledFrom(All()).Draw(t, "series")
		a := math.Pow(10, rapid.Float64Range(-17.9, 17).Draw(t, "log a"))
		b := a * rapid.Float64Range(1, 5).Draw(t, "ratio")
		for _, find := range []func(float64) (float64, error){s.Below, s.Nearest, s.Above} {
			x, err1 := find(a)
			y, err2 := find(b)
			if err1 != nil || err2 != nil || x > y {
				t.Fatalf("%v gives %v (%v), %v gives %v (%v)", a, x, err1, b, y, err2)
			}
		}
	})
}

// Each finer series of a family holds every value of the coarser; across the families it does not.
func TestFamiliesNest(t *testing.T) {
	for _, pair := range [][2]Series{{E3, E6}, {E6, E12}, {E12, E24}, {E48, E96}, {E96, E192}} {
		for _, m := range pair[0].Values() {
			v, _ := pair[0].Nearest(float64(m))
			if got, err := pair[1].Nearest(v); err != nil || got != v {
				t.Errorf("%v of %v is not in %v", v, pair[0], pair[1])
			}
		}
	}
	for _, v := range []float64{27, 33} { // of E24, absent from E192
		if got, _ := E192.Nearest(v); got == v {
			t.Errorf("%v is not in E192", v)
		}
	}
}
