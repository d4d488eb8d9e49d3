package waveform

import (
	"bufio"
	"bytes"
	"compress/gzip"
	"errors"
	"fmt"
	"io"

	"ringbook/snubber/quantity"
)

// MaxSamples bounds a record that is read from a file or unpacked: 134,217,728 samples, 1 GiB.
const MaxSamples = 1 << 27

// maxCSVLine bounds a line of text, in bytes.
const maxCSVLine = 64 << 10

// ReadCSV reads a waveform from CSV: two columns, time in seconds and volts, as UTF-8 text or as gzip of it (told by its
// first two bytes). The record's origin is name, and errors begin with it.
//
// The form is that of RFC 4180, with these freedoms: semicolons or tabs may stand for the commas (the first row decides),
// LF for CR LF; a byte order mark, one header row of names, comment lines that begin with #, blank lines, and empty cells
// after the second are passed over. Unlike there, a quoted cell must end on its line. A number is plain (1.25e-9) or
// whatever quantity.Parse reads (1.25n).
//
// The times must rise, evenly to within 1 %: over any run of samples the mean step is within 1 % of the record's, after one
// unit of the last place the times are printed with is allowed for their rounding, where that is at most a quarter of the
// step. The start is the first time as printed; the interval is last less first over the number of steps, at the fewest
// digits that this rounding of the two leaves open.
//
// An error names line and column. Memory is the samples', twice while they come in; the text is not held.
func ReadCSV(r io.Reader, name string) (Record, error) {
	file := name
	if file == "" {
		file = "the waveform"
	}
	in, err := plainText(r)
	if err != nil {
		return Record{}, fmt.Errorf("%s %w", file, err)
	}
	c := csvFile{in: in}
	rec := Record{Origin: name}
	if err := c.read(&rec); err != nil {
		return Record{}, fmt.Errorf("%s %w", file, err)
	}
	return rec, nil
}

// plainText takes off gzip and a byte order mark.
func plainText(r io.Reader) (*bufio.Reader, error) {
	in := bufio.NewReaderSize(r, maxCSVLine)
	if magic, _ := in.Peek(2); string(magic) == "\x1f\x8b" { // RFC 1952, 2.3.1
		z, err := gzip.NewReader(in)
		if err != nil {
			return nil, damaged(err)
		}
		in = bufio.NewReaderSize(z, maxCSVLine)
	}
	mark, _ := in.Peek(3) // an error shows again when the first line is read
	switch {
	case string(mark) == "\ufeff":
		_, _ = in.Discard(3)
	case bytes.HasPrefix(mark, []byte("\xff\xfe")), bytes.HasPrefix(mark, []byte("\xfe\xff")):
		return nil, errors.New("is UTF-16 text: save it as UTF-8")
	}
	return in, nil
}

func damaged(err error) error {
	return fmt.Errorf("is gzip that is damaged or cut off (%w): copy the file again", err)
}

// csvFile is a file being read.
type csvFile struct {
	in      *bufio.Reader
	line    int // the line last read, from 1
	sep     byte
	cells   [][]byte
	unquote []byte // where the cells of a quoted row stand
	times   timeline
	volts   pile
}

func (c *csvFile) read(rec *Record) error {
	header, n := 0, 0
	for {
		err := c.row()
		if err == io.EOF {
			break
		}
		if err != nil {
			return err
		}
		if n == 0 && header == 0 && isHeader(c.cells) {
			if err := c.checkHeader(); err != nil {
				return err
			}
			header = c.line
			continue
		}
		if err := c.checkWidth(); err != nil {
			return err
		}
		t, digits, errT := csvNumber(c.cells[0], quantity.Time)
		v, _, errV := csvNumber(c.cells[1], quantity.Voltage)
		switch {
		case errT != nil && errV != nil && header > 0 && n == 0:
			return fmt.Errorf("line %d: a second row of text above the samples (%q): delete it, or begin it with #", c.line, cutText(c.cells[0]))
		case errT != nil:
			return c.fault(1, errT)
		case errV != nil:
			return c.fault(2, errV)
		case n == MaxSamples:
			return fmt.Errorf("line %d: more than %d samples: cut the record to the part around the edge", c.line, MaxSamples)
		}
		if err := c.times.add(t, digits, c.line); err != nil {
			return err
		}
		c.volts.add(v)
		n++
	}
	switch {
	case c.line == 0:
		return errors.New("is empty: it needs two columns, time in seconds and volts")
	case n == 0:
		return fmt.Errorf("has no samples in its %d lines: it needs two columns, time in seconds and volts", c.line)
	case n == 1:
		return fmt.Errorf("has one sample, on line %d: an interval needs two, and a ring many more", c.line)
	}
	var err error
	rec.Start, rec.Volts = c.times.first+0, c.volts.all(n) // adding 0 makes a negative zero, which is no other instant, plain
	rec.Interval, err = c.times.interval()
	return err
}

func (c *csvFile) fault(column int, err error) error {
	name := [...]string{"time", "volts"}[column-1]
	return fmt.Errorf("line %d, column %d (%s): %w", c.line, column, name, err)
}

// pile holds samples until their number is known: one slice that grows would hold them 2.25 times while it is copied, and
// leave the most of that behind as garbage.
type pile struct {
	full [][]float64
	top  []float64
}

func (p *pile) add(v float64) {
	if len(p.top) == cap(p.top) {
		p.full = append(p.full, p.top)
		p.top = make([]float64, 0, min(max(512, 2*cap(p.top)), 1<<18))
	}
	p.top = append(p.top, v)
}

func (p *pile) all(n int) []float64 {
	volts := make([]float64, 0, n)
	for _, part := range p.full {
		volts = append(volts, part...)
	}
	return append(volts, p.top...)
}
