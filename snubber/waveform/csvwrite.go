package waveform

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"strconv"
)

// WriteCSV writes the record as ReadCSV reads it: a header row, then each sample's time in seconds and its volts, with the
// digits that read back to the same float64.
//
// Volts and start come back bit for bit. The interval does too where it has at most 12 digits or so, as an instrument's
// has; otherwise to within one unit of the last place the times are printed with, over the number of steps. StepV is not written.
// A record that would not come back is an error: one sample, or times so far from zero that float64 cannot tell the steps.
func WriteCSV(w io.Writer, r Record) error {
	if err := r.Check(); err != nil {
		return err
	}
	n := len(r.Volts)
	top := max(math.Abs(r.Start), math.Abs(r.TimeAt(n-1)))
	switch {
	case n < 2:
		return fmt.Errorf("a record of one sample at %g s: as CSV it would lose its interval, which two samples tell", r.Start)
	case !(top*0x1p-52 < r.Interval*evenTo):
		return fmt.Errorf("a record at %g s with steps of %g s: times so far from zero cannot tell the steps; start it nearer to 0 s", r.Start, r.Interval)
	}
	out := bufio.NewWriterSize(w, 64<<10)
	_, _ = out.WriteString("time_s,voltage_v\n") // a failure is kept for Flush
	line := make([]byte, 0, 64)
	for i, v := range r.Volts {
		line = strconv.AppendFloat(line[:0], r.TimeAt(i), 'g', -1, 64)
		line = append(line, ',')
		line = strconv.AppendFloat(line, v, 'g', -1, 64)
		line = append(line, '\n')
		if _, err := out.Write(line); err != nil {
			return fmt.Errorf("writing the record, sample %d of %d: %w", i+1, n, err)
		}
	}
	if err := out.Flush(); err != nil {
		return fmt.Errorf("writing the record's last samples: %w", err)
	}
	return nil
}
