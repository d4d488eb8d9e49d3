package preferred_test

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	. "ringbook/snubber/preferred"
)

// published reads the lists of IEC 60063 in testdata.
func published(t *testing.T) map[Series][]int {
	t.Helper()
	f, err := os.Open("testdata/eseries.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	lists := map[Series][]int{}
	for _, row := range rows[1:] {
		s, err := ParseSeries(row[0])
		if err != nil {
			t.Fatal(err)
		}
		for _, field := range strings.Fields(row[1]) {
			n, err := strconv.Atoi(field)
			if err != nil {
				t.Fatal(err)
			}
			lists[s] = append(lists[s], n)
		}
	}
	return lists
}

func TestValuesAreThoseOfIEC60063(t *testing.T) {
	lists := published(t)
	if len(lists) != len(All()) {
		t.Fatalf("%d lists; want %d", len(lists), len(All()))
	}
	for _, s := range All() {
		got := s.Values()
		if len(got) != int(s) {
			t.Errorf("%v has %d values", s, len(got))
		}
		if diff := cmp.Diff(lists[s], got); diff != "" {
			t.Errorf("%v (-published +got):\n%s", s, diff)
		}
	}
}

// The rule is 10^(i/n) rounded to the series' digits; IEC 60063 departs from it at eight places of E24 and at one of
// E192.
func TestExceptionsToTheRule(t *testing.T) {
	for _, c := range []struct {
		s      Series
		digits float64
		want   map[int]int // value by the rule, value of the standard
	}{
		{E24, 2, map[int]int{26: 27, 29: 30, 32: 33, 35: 36, 38: 39, 42: 43, 46: 47, 83: 82}},
		{E48, 3, map[int]int{}},
		{E96, 3, map[int]int{}},
		{E192, 3, map[int]int{919: 920}},
	} {
		got := map[int]int{}
		for i, v := range c.s.Values() {
			rule := int(math.Round(math.Pow(10, c.digits-1+float64(i)/float64(c.s))))
			if rule != v {
				got[rule] = v
			}
		}
		if diff := cmp.Diff(c.want, got); diff != "" {
			t.Errorf("%v (-want +got):\n%s", c.s, diff)
		}
	}
}

func TestValuesAreTheCallersOwn(t *testing.T) {
	for _, s := range All() {
		before := s.Values()[0]
		s.Values()[0] = 99
		if got := s.Values()[0]; got != before {
			t.Errorf("a caller changed %v: %d", s, got)
		}
	}
}

func TestSeriesAsFlagValue(t *testing.T) {
	var s Series
	if s.String() != "" || s.Type() != "series" {
		t.Errorf("zero value %q, type %q", s.String(), s.Type())
	}
	for _, want := range All() {
		for _, text := range []string{want.String(), strings.ToLower(want.String()), " " + want.String() + " "} {
			if err := s.Set(text); err != nil || s != want {
				t.Errorf("Set(%q): %v, %v", text, s, err)
			}
		}
	}
	for _, text := range []string{"", "12", "E13", "E", "E12x", "e-12"} {
		err := s.Set(text)
		if err == nil || !strings.Contains(err.Error(), strconv.Quote(text)) || !strings.Contains(err.Error(), "one of E3, E6") {
			t.Errorf("Set(%q): %v", text, err)
		}
		if s != E192 {
			t.Errorf("a refused Set left %v", s)
		}
	}
}

// IEC 60063, from secondary copies; that E3 is wider than 20 % is from memory.
func TestTolerance(t *testing.T) {
	for s, want := range map[Series]float64{E6: 0.20, E12: 0.10, E24: 0.05, E48: 0.02, E96: 0.01, E192: 0.005} {
		if got, bounded := s.Tolerance(); got != want || !bounded {
			t.Errorf("%v: %v, %v; want %v", s, got, bounded, want)
		}
	}
	if got, bounded := E3.Tolerance(); got != 0.20 || bounded {
		t.Errorf("E3: %v, %v", got, bounded)
	}
	if got, bounded := Series(5).Tolerance(); got != 0 || bounded {
		t.Errorf("series 5: %v, %v", got, bounded)
	}
}
