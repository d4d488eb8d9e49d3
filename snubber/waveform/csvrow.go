package waveform

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"

	"ringbook/snubber/quantity"
)

// row puts the cells of the next row that is neither blank nor a comment into c.cells; io.EOF when there is none.
func (c *csvFile) row() error {
	for {
		line, err := c.next()
		if err != nil {
			return err
		}
		text := bytes.TrimSpace(line)
		if len(text) == 0 || text[0] == '#' {
			continue
		}
		if c.sep == 0 {
			c.sep = separator(text)
		}
		if err := c.split(line); err != nil {
			return err
		}
		// What spreadsheets leave below the last row is passed over.
		if slices.ContainsFunc(c.cells, func(cell []byte) bool { return len(cell) > 0 }) {
			return nil
		}
	}
}

// next is the next line without its end.
func (c *csvFile) next() ([]byte, error) {
	line, err := c.in.ReadSlice('\n')
	switch {
	case err == bufio.ErrBufferFull:
		if bytes.IndexByte(line, '\r') >= 0 {
			return nil, loneReturn(c.line + 1)
		}
		return nil, fmt.Errorf("line %d is longer than %d bytes: each sample needs a line, with its time and its volts", c.line+1, maxCSVLine)
	case err == io.EOF && len(line) == 0:
		return nil, io.EOF
	case err != nil && err != io.EOF:
		if c.line == 0 {
			return nil, damagedAt(err)
		}
		return nil, fmt.Errorf("after line %d: %w", c.line, damagedAt(err))
	}
	c.line++
	line = bytes.TrimRight(line, "\r\n")
	if bytes.IndexByte(line, '\r') >= 0 {
		return nil, loneReturn(c.line)
	}
	return line, nil
}

// damagedAt tells a damaged gzip from a reader that failed.
func damagedAt(err error) error {
	text := err.Error()
	if errors.Is(err, io.ErrUnexpectedEOF) || strings.HasPrefix(text, "gzip:") || strings.HasPrefix(text, "flate:") {
		return damaged(err)
	}
	return fmt.Errorf("cannot be read: %w", err)
}

func loneReturn(line int) error {
	return fmt.Errorf("line %d has a carriage return that no line feed follows: end the lines with LF or CR LF", line)
}

// separator is what stands between the cells of the first row: a tab, else a semicolon, else a comma.
func separator(line []byte) byte {
	quoted := false
	found := byte(',')
	for _, b := range line {
		switch {
		case b == '"':
			quoted = !quoted
		case quoted:
		case b == '\t':
			return '\t'
		case b == ';':
			found = ';'
		}
	}
	return found
}

// split cuts a line into cells, without the spaces around them.
func (c *csvFile) split(line []byte) error {
	c.cells = c.cells[:0]
	if bytes.IndexByte(line, '"') >= 0 {
		return c.splitQuoted(line)
	}
	for {
		i := bytes.IndexByte(line, c.sep)
		if i < 0 {
			c.cells = append(c.cells, bytes.TrimSpace(line))
			return nil
		}
		c.cells = append(c.cells, bytes.TrimSpace(line[:i]))
		line = line[i+1:]
	}
}

func (c *csvFile) splitQuoted(line []byte) error {
	c.unquote = slices.Grow(c.unquote[:0], len(line)) // no cell moves while others are cut
	for {
		rest := bytes.TrimLeft(line, " ")
		if len(rest) == 0 || rest[0] != '"' {
			cell, after, more := bytes.Cut(line, []byte{c.sep})
			c.cells = append(c.cells, bytes.TrimSpace(cell))
			if !more {
				return nil
			}
			line = after
			continue
		}
		from := len(c.unquote)
		rest = rest[1:]
		for {
			i := bytes.IndexByte(rest, '"')
			if i < 0 {
				return fmt.Errorf("line %d, column %d: a quotation mark is opened and not closed on its line: close it", c.line, len(c.cells)+1)
			}
			c.unquote = append(c.unquote, rest[:i]...)
			rest = rest[i+1:]
			if len(rest) == 0 || rest[0] != '"' {
				break
			}
			c.unquote = append(c.unquote, '"')
			rest = rest[1:]
		}
		c.cells = append(c.cells, bytes.TrimSpace(c.unquote[from:]))
		rest = bytes.TrimLeft(rest, " ")
		if len(rest) == 0 {
			return nil
		}
		if rest[0] != c.sep {
			return fmt.Errorf("line %d, column %d: text follows the closing quotation mark: put all of the cell inside", c.line, len(c.cells))
		}
		line = rest[1:]
	}
}

// isHeader says whether the first row names columns: it has text, and no number in its first two cells.
func isHeader(cells [][]byte) bool {
	for _, cell := range cells[:min(2, len(cells))] {
		if _, _, err := csvNumber(cell, quantity.Ratio); err == nil || len(cell) == 0 || notFinite(cell) {
			return false
		}
	}
	return true
}

func notFinite(cell []byte) bool {
	text := strings.ToLower(strings.TrimLeft(string(cell), "+-"))
	return text == "nan" || text == "inf" || text == "infinity"
}

// checkHeader refuses a header row of other than two columns, or one that names another unit.
func (c *csvFile) checkHeader() error {
	if err := c.checkWidth(); err != nil {
		return err
	}
	for i, want := range [...]string{"seconds", "volts"} {
		name := string(c.cells[i])
		if u := headerUnit(name); u != "" {
			return fmt.Errorf("line %d, column %d (%q) is in %s: write it in %s, without a prefix", c.line, i+1, cutText(c.cells[i]), u, want)
		}
	}
	return nil
}

// headerUnit is the unit with a prefix that a column's name ends with: "ns" of "time_ns" and of "Time (ns)"; "" when none.
func headerUnit(name string) string {
	name = strings.TrimRight(name, ")] ")
	if i := strings.LastIndexAny(name, "([_/ "); i >= 0 {
		name = name[i+1:]
	}
	switch name {
	case "ms", "us", "\u00b5s", "\u03bcs", "ns", "ps", "min", "uV", "\u00b5V", "\u03bcV", "mV", "kV":
		return name
	}
	return ""
}

// checkWidth refuses a row that has not two columns.
func (c *csvFile) checkWidth() error {
	if len(c.cells) < 2 {
		return fmt.Errorf("line %d has one column (%q): a waveform needs two, time in seconds and volts, with a comma, a semicolon or a tab between them", c.line, cutText(c.cells[0]))
	}
	for i, cell := range c.cells[2:] {
		if len(cell) > 0 {
			return fmt.Errorf("line %d, column %d (%q): a waveform has two columns, time in seconds and volts: leave out the others", c.line, i+3, cutText(cell))
		}
	}
	return nil
}

// cutText shortens what would flood a terminal.
func cutText(cell []byte) string {
	const most = 40
	if len(cell) <= most {
		return string(cell)
	}
	return strings.ToValidUTF8(string(cell[:most]), "") + "..."
}
