package store

import (
	"fmt"
	"slices"
	"strings"
)

// header finds each named column, and reports every name that is unknown, missing or there twice.
func (c *reader) header(names []string) error {
	if len(names) == 1 {
		for _, by := range []struct{ mark, name string }{{";", "semicolons"}, {"\t", "tabs"}, {"|", "bars"}} {
			if strings.Contains(names[0], by.mark) {
				return fmt.Errorf("%sline 1: its cells seem to be separated by %s; save it with commas between the cells and points in the numbers", c.file, by.name)
			}
		}
	}
	c.width = len(names)
	c.place = make([]int, len(c.columns))
	for i := range c.place {
		c.place[i] = -1
	}
	var faults []string
	for at, name := range names {
		name = strings.TrimSpace(name)
		i := slices.IndexFunc(c.columns, func(col column) bool { return col.name == name })
		switch {
		case i < 0:
			faults = append(faults, fmt.Sprintf("column %d %s is not one of the columns%s", at+1, quote(name), c.suggestion(name)))
		case c.place[i] >= 0:
			faults = append(faults, fmt.Sprintf("column %d %s is there twice (column %d too); keep one", at+1, quote(name), c.place[i]+1))
		default:
			c.place[i] = at
		}
	}
	for i, col := range c.columns {
		if c.place[i] < 0 && (col.name == "board" || col.name == "revision" || col.name == "network") {
			faults = append(faults, fmt.Sprintf("column %s is missing; every trial needs it", col.name))
		}
	}
	if len(faults) == 0 {
		return nil
	}
	const most = 10
	if more := len(faults) - most; more > 0 {
		faults = append(faults[:most], fmt.Sprintf("and %d more", more))
	}
	var known []string
	for _, col := range c.columns {
		known = append(known, col.name)
	}
	return fmt.Errorf("%sline 1: %s\nthe columns are %s", c.file, strings.Join(faults, "\n  "), strings.Join(known, ", "))
}

// suggestion names the column that takes the fewest changed letters to get from name, where these are at most half of it.
func (c *reader) suggestion(name string) string {
	best, least := "", (len(name)+1)/2
	if len(name) > maxName {
		return ""
	}
	for _, col := range c.columns {
		if d := editDistance(strings.ToLower(name), col.name); d < least || d == least && best == "" {
			best, least = col.name, d
		}
	}
	if best == "" {
		return ""
	}
	return "; did you mean " + best + "?"
}

// editDistance counts the insertions, deletions and substitutions from a to b (V. I. Levenshtein, "Binary codes capable of
// correcting deletions, insertions and reversals", Soviet Physics Doklady 10 (1966) 707).
func editDistance(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			substitute := diagonal
			if a[i] != b[j] {
				substitute++
			}
			diagonal = row[j+1]
			row[j+1] = min(substitute, row[j+1]+1, row[j]+1)
		}
	}
	return row[len(b)]
}
