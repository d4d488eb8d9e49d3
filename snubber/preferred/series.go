package preferred

import (
	"fmt"
	"strings"
)

// Series is one of the E series, named by how many values it has in a decade. The zero value is no series: it
// means "not given", and finds nothing.
type Series int

// The series of IEC 60063.
const (
	E3   Series = 3
	E6   Series = 6
	E12  Series = 12
	E24  Series = 24
	E48  Series = 48
	E96  Series = 96
	E192 Series = 192
)

// All lists the series, the coarsest first.
func All() []Series { return []Series{E3, E6, E12, E24, E48, E96, E192} }

// ParseSeries reads a series by its name, "E12" or "e12". Any other text is an error that quotes it.
func ParseSeries(s string) (Series, error) {
	for _, e := range All() {
		if strings.EqualFold(strings.TrimSpace(s), e.String()) {
			return e, nil
		}
	}
	return 0, fmt.Errorf("series %q: it is to be one of E3, E6, E12, E24, E48, E96, E192", s)
}

// String is the series' name; "" for the zero value.
func (s Series) String() string {
	if s == 0 {
		return ""
	}
	return fmt.Sprintf("E%d", int(s))
}

// Set makes a Series a flag value; it reads as ParseSeries does and leaves s as it was when that fails.
func (s *Series) Set(text string) error {
	e, err := ParseSeries(text)
	if err == nil {
		*s = e
	}
	return err
}

// Type is the word that help texts show for the value.
func (Series) Type() string { return "series" }

// table gives the list that s is part of, the step at which it takes from it, and how many digits its numbers
// have; ok is false when s is no series.
func (s Series) table() (list []int, step, digits int, ok bool) {
	switch s {
	case E3, E6, E12, E24:
		return coarse[:], len(coarse) / int(s), 2, true
	case E48, E96, E192:
		return fine[:], len(fine) / int(s), 3, true
	}
	return nil, 0, 0, false
}

// Values are the numbers of one decade in rising order, as the standard prints them: two digits (10, 22, 47) up to
// E24, three (100, 105, 110) from E48. It is nil when s is no series.
func (s Series) Values() []int {
	list, step, _, ok := s.table()
	if !ok {
		return nil
	}
	values := make([]int, 0, int(s))
	for i := 0; i < len(list); i += step {
		values = append(values, list[i])
	}
	return values
}

// Tolerance is the bound of a part's error that the series is meant for, as a fraction of its value: 0.20 for E6,
// 0.10, 0.05, 0.02, 0.01, and 0.005 for E192, whose parts may also be better.
//
// E3 has no bound: its parts are wider than 20 % (from memory), and bounded is false with t = 0.20. For what is
// no series it is 0, false.
func (s Series) Tolerance() (t float64, bounded bool) {
	switch s {
	case E3:
		return 0.20, false
	case E6:
		return 0.20, true
	case E12:
		return 0.10, true
	case E24:
		return 0.05, true
	case E48:
		return 0.02, true
	case E96:
		return 0.01, true
	case E192:
		return 0.005, true
	}
	return 0, false
}
