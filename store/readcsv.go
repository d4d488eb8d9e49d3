package store

import (
	"bufio"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"iter"
	"path/filepath"
	"strings"

	"ringbook/snubber"
)

// ReadCSV streams trials from CSV (RFC 4180, in UTF-8, with or without a byte order mark): a header row that names the
// columns, in any order, then a row for each trial. board, revision and network must be there; an empty cell means "not
// read". Numbers are SI numbers or engineering notation as quantity.Parse reads them, *_tol a fraction or a percentage, at
// a time as RFC 3339 writes it.
//
// The columns are those of trial_table without id, and besides them esr (ohm), measured_c and measured_c_u (F), supply_a,
// supply_a_u (A), temp_c, temp_c_u (degree Celsius), session, struck (the reason, of a trial already marked as wrong), and
// from_waveform (which of the readings were computed from a waveform, their names with spaces between them).
//
// Every bad row is looked for: the sequence yields trials up to the first, and ends with one BadRows error that names the
// lines, columns and cells of the first twenty. Given to Logbook.AddAll, a file with a bad row logs nothing. Where r has a
// Name, as *os.File does, errors begin with it. One row at a time is held in memory.
func ReadCSV(r io.Reader) iter.Seq2[snubber.Trial, error] {
	return func(yield func(snubber.Trial, error) bool) {
		c, err := newReader(r)
		if err != nil {
			yield(snubber.Trial{}, err)
			return
		}
		bad := &BadRows{}
		for {
			t, faults, err := c.row()
			switch {
			case err == io.EOF:
				if bad.Rows > 0 {
					yield(snubber.Trial{}, bad)
				}
				return
			case err != nil:
				yield(snubber.Trial{}, err)
				return
			case len(faults) > 0:
				bad.add(faults)
			case bad.Rows == 0 && !yield(t, nil):
				return
			}
		}
	}
}

// maxRow bounds one row, in bytes: a quotation mark left open would otherwise take in the whole file.
const maxRow = 4 << 20

type reader struct {
	file    string // how errors begin: the file's name and a space, or nothing
	in      *csv.Reader
	bound   *bounded
	columns []column
	place   []int // columns[i] stands in field place[i] of a row; -1: it is not in this file
	width   int   // fields in a row
	line    int   // where the last row that could be read begins
}

func newReader(r io.Reader) (*reader, error) {
	c := &reader{columns: columns()}
	if named, ok := r.(interface{ Name() string }); ok {
		c.file = filepath.Base(named.Name()) + " "
	}
	start := bufio.NewReader(r)
	mark, _ := start.Peek(3) // an error shows again when the header is read
	switch s := string(mark); {
	case s == "\ufeff":
		_, _ = start.Discard(3)
	case strings.HasPrefix(s, "\xff\xfe"), strings.HasPrefix(s, "\xfe\xff"):
		return nil, fmt.Errorf("%sis UTF-16 text; save it as UTF-8", c.file)
	}
	c.bound = &bounded{start, maxRow}
	c.in = csv.NewReader(c.bound)
	c.in.FieldsPerRecord = -1 // counted here, to say it in this program's words
	c.in.ReuseRecord = true
	c.in.TrimLeadingSpace = true
	header, err := c.in.Read()
	if err == io.EOF {
		return nil, fmt.Errorf("%sis empty; its first row must name the columns: board, revision, network and what was read", c.file)
	}
	var syntax *csv.ParseError
	if errors.As(err, &syntax) {
		return nil, c.syntax(syntax)
	}
	if err != nil {
		return nil, fmt.Errorf("%sheader row: %w", c.file, err)
	}
	c.line = 1
	return c, c.header(header)
}

// row is the next trial, or what is wrong with the next row.
func (c *reader) row() (t snubber.Trial, faults []error, err error) {
	for {
		c.bound.left = maxRow
		fields, err := c.in.Read()
		var syntax *csv.ParseError
		switch {
		case errors.As(err, &syntax):
			return t, []error{c.syntax(syntax)}, nil
		case err == io.EOF:
			return t, nil, err
		case err != nil:
			return t, nil, fmt.Errorf("%safter line %d: %w", c.file, c.line, err)
		}
		c.line, _ = c.in.FieldPos(0)
		if empty(fields) {
			continue // what spreadsheets leave below the last row
		}
		if len(fields) != c.width {
			return t, []error{fmt.Errorf("%sline %d: %d cells where the header row has %d; an empty cell still needs its comma", c.file, c.line, len(fields), c.width)}, nil
		}
		t, faults = c.trial(fields)
		return t, faults, nil
	}
}

func (c *reader) trial(fields []string) (t snubber.Trial, faults []error) {
	for i, col := range c.columns {
		at := c.place[i]
		if at < 0 {
			continue
		}
		cell := fields[at]
		if col.name != "part" && col.name != "note" && col.name != "struck" {
			cell = strings.TrimSpace(cell)
		}
		if cell == "" {
			continue
		}
		if err := col.set(&t, cell); err != nil {
			faults = append(faults, c.fault(fields, at, err))
		}
	}
	if len(faults) > 0 {
		return t, faults
	}
	inOrder(t.Readings)
	if err := Check(t); err != nil {
		name, err := onColumn(err)
		for i, col := range c.columns {
			if col.name == name && c.place[i] >= 0 {
				return t, []error{c.fault(fields, c.place[i], err)}
			}
		}
		return t, []error{fmt.Errorf("%sline %d (%s): %w", c.file, c.line, name, err)}
	}
	return t, nil
}

// fault is err with the place and the text of its cell.
func (c *reader) fault(fields []string, at int, err error) error {
	line, _ := c.in.FieldPos(at)
	cell := quote(strings.TrimSpace(fields[at]))
	if !strings.Contains(err.Error(), cell) {
		err = fmt.Errorf("%s: %w", cell, err)
	}
	return fmt.Errorf("%sline %d, column %d (%s): %w", c.file, line, at+1, c.name(at), err)
}

func (c *reader) name(at int) string {
	for i, p := range c.place {
		if p == at {
			return c.columns[i].name
		}
	}
	return "?"
}

func (c *reader) syntax(err *csv.ParseError) error {
	why := err.Err
	if errors.Is(why, csv.ErrQuote) || errors.Is(why, csv.ErrBareQuote) {
		why = errors.New(`a quotation mark stands where it cannot; put the whole cell in "..." and write a mark inside it twice`)
	}
	return fmt.Errorf("%sline %d, character %d: %w", c.file, err.Line, err.Column, why)
}

func empty(fields []string) bool {
	for _, f := range fields {
		if strings.TrimSpace(f) != "" {
			return false
		}
	}
	return true
}

// bounded fails when more than left bytes are read before left is set anew.
type bounded struct {
	r    io.Reader
	left int
}

func (b *bounded) Read(p []byte) (int, error) {
	if b.left <= 0 {
		return 0, fmt.Errorf("a row of more than %d bytes; see whether a quotation mark was left open", maxRow)
	}
	n, err := b.r.Read(p[:min(len(p), b.left)])
	b.left -= n
	return n, err
}
