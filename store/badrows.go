package store

import (
	"fmt"
	"strings"
)

// mostBadRows is how many bad rows are told in full.
const mostBadRows = 20

// BadRows is everything found wrong in a CSV file's rows, so that all can be mended at once.
type BadRows struct {
	Rows  int     // how many rows are bad
	Cells []error // what is wrong in the first twenty of them, each with its line, column and cell
}

func (b *BadRows) add(faults []error) {
	if b.Rows++; b.Rows <= mostBadRows {
		b.Cells = append(b.Cells, faults...)
	}
}

// Error has a line for each bad cell, and one for the rows that are not told.
func (b *BadRows) Error() string {
	var lines []string
	for _, err := range b.Cells {
		lines = append(lines, err.Error())
	}
	if more := b.Rows - mostBadRows; more > 0 {
		lines = append(lines, fmt.Sprintf("and %d more rows", more))
	}
	return strings.Join(lines, "\n")
}

// Unwrap gives the single errors to errors.Is and errors.As.
func (b *BadRows) Unwrap() []error { return b.Cells }
