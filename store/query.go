package store

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"ringbook/snubber"
)

// Query asks for trials by what is said of them. All that is given must hold; the zero Query is every trial that stands, in
// the order of time.
type Query struct {
	Scope // board, revision, time; Limit is the length of a page: the first so many in the order asked for

	// Words that are in the board's or the revision's name, the part, the note or the name of an instrument, each in any of
	// them: all of them in any order; "words together"; the beginning of a word*. Case and accents do not count.
	Words string

	Network    snubber.Kind // "" for any
	OnlyStruck bool         // those marked as wrong alone; implies IncludeStruck

	C, R          Range // F, ohm: of the network
	RingHz, PeakV Range // Hz, V: as read

	Sort       Sort
	Descending bool
	After      string // begin after this trial in the order asked for: the whole id of the last one on the page before
}

// Range is from Min to Max, both included; 0 is no bound. What was not stated or not read is in no range that has a bound.
type Range struct{ Min, Max float64 }

// Sort is what trials are ordered by. Those that do not have it come last, and equals in the order of logging.
type Sort string

// The orders of a Query.
const (
	ByTime   Sort = "" // when it was read
	ByC      Sort = "c"
	ByR      Sort = "r"
	ByRingHz Sort = "ring_hz"
	ByPeakV  Sort = "peak_v"
)

// Sorts lists every order, as their columns are named; at is ByTime.
func Sorts() []string { return []string{"at", "c", "r", "ring_hz", "peak_v"} }

// ParseSort reads the name of a column to sort by.
func ParseSort(name string) (Sort, error) {
	switch s := Sort(strings.ToLower(strings.TrimSpace(name))); s {
	case ByC, ByR, ByRingHz, ByPeakV:
		return s, nil
	case ByTime, "at":
		return ByTime, nil
	}
	return ByTime, fmt.Errorf("sort by %s: not one of %s", quote(name), strings.Join(Sorts(), ", "))
}

// check reports the first thing that makes no sense, before SQLite sees it.
func (q *Query) check() error {
	if _, err := ParseSort(string(q.Sort)); err != nil {
		return err
	}
	if q.Limit < 0 {
		return fmt.Errorf("a page of %d trials: it must be 0 (all) or more", q.Limit)
	}
	if q.Network != "" {
		if _, err := snubber.ParseKind(string(q.Network)); err != nil {
			return err
		}
	}
	for _, r := range []struct {
		name string
		Range
	}{{"c", q.C}, {"r", q.R}, {"ring_hz", q.RingHz}, {"peak_v", q.PeakV}} {
		if math.IsNaN(r.Min) || math.IsNaN(r.Max) || r.Min != 0 && r.Max != 0 && r.Min > r.Max {
			return fmt.Errorf("%s from %g to %g: give the lower bound first", r.name, r.Min, r.Max)
		}
	}
	return nil
}

// condition is what the query asks of trial t besides its words and its place in the order.
func (q *Query) condition() (string, []any) {
	s := q.Scope
	s.IncludeStruck = s.IncludeStruck || q.OnlyStruck
	where, args := s.where()
	add := func(condition string, values ...any) {
		where, args = where+" AND "+condition, append(args, values...)
	}
	if q.OnlyStruck {
		add("EXISTS (SELECT 1 FROM strike k WHERE k.trial = t.seq)")
	}
	if q.Network != "" {
		add("t.network = ?", string(q.Network))
	}
	for _, column := range []struct {
		name string
		Range
	}{{"t.c", q.C}, {"t.r", q.R}} {
		if in, bounds := column.in(column.name); in != "" {
			add(in, bounds...)
		}
	}
	for _, r := range q.readings() {
		in, bounds := r.in("x.value")
		add("EXISTS (SELECT 1 FROM reading x WHERE x.trial = t.seq AND x.quantity = '"+r.quantity+"' AND "+in+")", bounds...)
	}
	return where, args
}

// readRange is a range of a quantity as read.
type readRange struct {
	quantity string
	Range
}

// readings are the ranges asked for.
func (q *Query) readings() []readRange {
	all := []readRange{{"ring_hz", q.RingHz}, {"peak_v", q.PeakV}}
	return slices.DeleteFunc(all, func(r readRange) bool { return r.Range == Range{} })
}

// in is the condition that value is in r; "" where r has no bound.
func (r Range) in(value string) (string, []any) {
	var bounds []string
	var args []any
	if r.Min != 0 {
		bounds, args = append(bounds, value+" >= ?"), append(args, r.Min)
	}
	if r.Max != 0 {
		bounds, args = append(bounds, value+" <= ?"), append(args, r.Max)
	}
	return strings.Join(bounds, " AND "), args
}

// key is the value of trial t that the query sorts by, in SQL.
func (q *Query) key() string {
	switch q.Sort {
	case ByC, ByR:
		return "t." + string(q.Sort)
	case ByRingHz, ByPeakV:
		return "(SELECT x.value FROM reading x WHERE x.trial = t.seq AND x.quantity = '" + string(q.Sort) + "')"
	}
	return "t.at"
}

// order is the order asked for, of columns named at (the key) and seq in table.
func (q *Query) order(table string) string {
	turn := ""
	if q.Descending {
		turn = " DESC"
	}
	by := table + ".at" + turn + ", " + table + ".seq" + turn
	if q.Sort != ByTime {
		by = table + ".at IS NULL, " + by
	}
	return by
}
