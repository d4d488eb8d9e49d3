package store

import (
	"encoding/csv"
	"fmt"
	"io"
	"iter"

	"ringbook/snubber"
)

// WriteCSV writes trials as CSV with the columns ReadCSV reads, and says how many it wrote. What was read from CSV is
// written without loss: numbers are unscaled SI in the shortest form that reads back as the same float64. Ids, the
// instruments, single repeats, waveforms, and the uncertainty of an operating point's readings have no column.
func WriteCSV(w io.Writer, trials iter.Seq2[snubber.Trial, error]) (n int, err error) {
	all := columns()
	row := make([]string, len(all))
	for i, c := range all {
		row[i] = c.name
	}
	out := csv.NewWriter(w)
	if err := out.Write(row); err != nil {
		return 0, fmt.Errorf("write CSV: %w", err)
	}
	for t, err := range trials {
		if err != nil {
			return n, err
		}
		for i, c := range all {
			row[i] = c.get(&t)
		}
		if err := out.Write(row); err != nil {
			return n, fmt.Errorf("write CSV: %w", err)
		}
		n++
	}
	out.Flush()
	if err := out.Error(); err != nil {
		return n, fmt.Errorf("write CSV: %w", err)
	}
	return n, nil
}
