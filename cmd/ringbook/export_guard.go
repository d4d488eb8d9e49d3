package main

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"io"
	"iter"
	"slices"
	"strings"
	"unicode/utf8"

	"ringbook/snubber"
	"ringbook/store"
)

// A spreadsheet takes a cell that begins with = + - or @ for a formula. An exported text that begins so gets an apostrophe in
// front, and a last column says in which columns that was done, so that an import can undo it and nothing else: in a file
// without that column an apostrophe is part of the text.

const guardedColumn = "guarded"

// guardable are the columns with words that people wrote.
var guardable = [...]string{"board", "revision", "part", "note", "session", "struck"}

// formula is whether a spreadsheet may take a text for one, with the full-width forms of the signs.
func formula(s string) bool {
	first, _ := utf8.DecodeRuneInString(strings.TrimLeft(s, " \t\n\u00a0"))
	return s != "" && strings.ContainsRune("=+-@＝＋－＠", first)
}

// writeGuarded writes trials as store.WriteCSV does, with texts guarded, and says how many.
func writeGuarded(w io.Writer, trials iter.Seq2[snubber.Trial, error]) (n int, err error) {
	r, in := io.Pipe()
	wrote := make(chan error, 1)
	go func() {
		var err error
		n, err = store.WriteCSV(in, trials)
		in.CloseWithError(err) // nil is the end of the file
		wrote <- err
	}()
	_, err = io.Copy(w, recast(r, guardTexts))
	r.CloseWithError(err) // where w fails, WriteCSV fails as well
	if failed := <-wrote; failed != nil {
		return n, failed
	}
	if err != nil {
		return n, fmt.Errorf("write CSV: %w", err)
	}
	return n, nil
}

// guardTexts guards one row.
func guardTexts(header, row []string) ([]string, error) {
	if header == nil {
		return append(row, guardedColumn), nil
	}
	var names []string
	for i, name := range header {
		if slices.Contains(guardable[:], name) && formula(row[i]) {
			row[i] = "'" + row[i]
			names = append(names, name)
		}
	}
	return append(row, strings.Join(names, " ")), nil
}

// unguardTexts takes the guards of one row off. A cell whose apostrophe is gone, as after a spreadsheet, stays as it is.
func unguardTexts(header, row []string) ([]string, error) {
	at := slices.Index(header, guardedColumn)
	if header == nil {
		at = slices.Index(row, guardedColumn)
	}
	if at >= len(row) { // too short a row; it is to stay one cell short
		return row[:len(row)-1], nil
	}
	if header != nil {
		for _, name := range strings.Fields(row[at]) {
			i := slices.Index(header, name)
			if i < 0 {
				return nil, fmt.Errorf("column %s names %q, which is no column of this file", guardedColumn, name)
			}
			if i < len(row) {
				row[i] = strings.TrimPrefix(row[i], "'")
			}
		}
	}
	return slices.Delete(row, at, at+1), nil
}

// mostRow bounds a row, in bytes; store.ReadCSV takes no longer one.
const mostRow = 4 << 20

// recasting is CSV whose rows are changed as they are read. Each row keeps its line.
type recasting struct {
	in     *csv.Reader
	bound  *io.LimitedReader                            // of a row: a mark left open would otherwise take in the whole file
	change func(header, row []string) ([]string, error) // header is nil for the header row
	header []string
	text   bytes.Buffer
	line   int // of the text, from 1
}

func recast(r io.Reader, change func(header, row []string) ([]string, error)) *recasting {
	bound := &io.LimitedReader{R: r}
	c := &recasting{in: csv.NewReader(bound), bound: bound, change: change, line: 1}
	c.in.FieldsPerRecord = -1    // whoever reads the text counts
	c.in.TrimLeadingSpace = true // as store.ReadCSV does
	return c
}

func (c *recasting) Read(p []byte) (int, error) {
	for c.text.Len() == 0 {
		if err := c.row(); err != nil {
			return 0, err
		}
	}
	return c.text.Read(p)
}

func (c *recasting) row() error {
	c.bound.N = mostRow
	row, err := c.in.Read()
	if c.bound.N <= 0 {
		return fmt.Errorf("after line %d: a row of more than %d bytes; see whether a quotation mark was left open", c.line, mostRow)
	}
	if err != nil {
		return err
	}
	line, _ := c.in.FieldPos(0)
	if c.header == nil {
		for i := range row {
			row[i] = strings.TrimSpace(row[i])
		}
	}
	var header []string
	if c.header == nil {
		header = slices.Clone(row)
	}
	if row, err = c.change(c.header, row); err != nil {
		return fmt.Errorf("line %d: %w", line, err)
	}
	if header != nil {
		c.header = header
	}
	for ; c.line < line; c.line++ {
		c.text.WriteByte('\n')
	}
	from := c.text.Len()
	out := csv.NewWriter(&c.text)
	if err := out.Write(row); err != nil {
		return err
	}
	out.Flush()
	c.line += bytes.Count(c.text.Bytes()[from:], []byte{'\n'})
	return out.Error()
}
