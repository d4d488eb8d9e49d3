package page

import (
	"fmt"
	"math"
	"time"

	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// kind is what a column's cells hold.
type kind uint8

const (
	words kind = iota
	label
	part
	number
	fraction
	measured
	interval
	instant
)

// Column is one column of a table; one of the functions below makes it. Each takes the name for the head
// and the name for CSV, which carries unscaled SI values and so ends with the unit (ring_hz). Those for
// quantities take the unit too; the head then reads "quantity / unit" (SI Brochure, 9th edition, 5.4.1)
// with one SI prefix for the whole column.
//
// A cell may be nil in any column: nothing was read, or the trials cannot tell. It prints as an en dash
// and is empty in CSV. A nil *snubber.Estimate and a zero time.Time are the same; an empty string is blank.
type Column struct {
	head string
	unit quantity.Unit
	csv  string
	kind kind
}

// Words is a column of prose: string cells, wrapped where the table is too wide, and cut with an ellipsis
// after three lines in the terminal. No other output cuts them.
func Words(head, csv string) Column { return Column{head, quantity.Ratio, csv, words} }

// Label is a column of short names: string cells, never wrapped, and cut in the terminal beyond 38
// columns or half its width.
func Label(head, csv string) Column { return Column{head, quantity.Ratio, csv, label} }

// Part is a column of parts' values as their IEC 60062 codes (470p, 4k7); cells as for Number.
func Part(head string, unit quantity.Unit, csv string) Column { return Column{head, unit, csv, part} }

// Number is a column of values without uncertainty, to four significant digits; whole pure numbers are
// shown in full. Cells are float64, int, snubber.Estimate, *snubber.Estimate or snubber.Reading.
func Number(head string, unit quantity.Unit, csv string) Column {
	return Column{head, unit, csv, number}
}

// Percent is a column of fractions shown in percent; CSV keeps the fraction. Cells as for Number.
func Percent(head, csv string) Column { return Column{head, quantity.Ratio, csv, fraction} }

// Measured is a column of values with their standard uncertainties, as value(uncertainty in the last two
// digits) (JCGM 100:2008, 7.2.2). Cells as for Number; one without uncertainty is shown as by Number. CSV has a
// second column, its name ending in _u.
func Measured(head string, unit quantity.Unit, csv string) Column {
	return Column{head, unit, csv, measured}
}

// Interval is a column of 95 % intervals, Low to High of a snubber.Estimate. In CSV the names end in
// _low and _high.
func Interval(head string, unit quantity.Unit, csv string) Column {
	return Column{head, unit, csv, interval}
}

// Instant is a column of time.Time cells: the wall clock of the zone each carries, named in the head when
// all share it. CSV has RFC 3339.
func Instant(head, csv string) Column { return Column{head, quantity.Ratio, csv, instant} }

// cell is one cell, checked: empty, or holding what its column's kind holds.
type cell struct {
	full             bool
	text             string
	value, low, high float64
	u                float64 // 0: not stated
	at               time.Time
}

// cell checks v against the column's kind.
func (c Column) cell(v any) (cell, error) {
	if v == nil {
		return cell{}, nil
	}
	x := cell{full: true}
	switch c.kind {
	case words, label:
		s, ok := v.(string)
		if !ok {
			return cell{}, c.refuse(v, "a string")
		}
		x.text = plain(s)
	case instant:
		at, ok := v.(time.Time)
		if !ok {
			return cell{}, c.refuse(v, "a time.Time")
		}
		x.at, x.full = at, !at.IsZero()
	default:
		if !x.setNumber(v) {
			return cell{}, c.refuse(v, "a float64, an int, a snubber.Estimate or a snubber.Reading")
		}
	}
	return x, nil
}

// setNumber takes the numbers out of v; false when it holds none.
func (x *cell) setNumber(v any) bool {
	x.low, x.high = math.NaN(), math.NaN()
	switch v := v.(type) {
	case float64:
		x.value = v
	case int:
		x.value = float64(v)
	case snubber.Reading:
		x.value, x.u = v.Value, v.U
	case snubber.Estimate:
		x.value, x.u = v.Value, v.U
		if v.Low != 0 || v.High != 0 {
			x.low, x.high = v.Low, v.High
		}
	case *snubber.Estimate:
		if v == nil {
			*x = cell{}
			return true
		}
		return x.setNumber(*v)
	default:
		return false
	}
	return true
}

// bounded says whether the cell has an interval.
func (x cell) bounded() bool { return x.full && !(math.IsNaN(x.low) && math.IsNaN(x.high)) }

func (c Column) refuse(v any, want string) error {
	return fmt.Errorf("column %q: a cell of type %T; give it %s, or nil where there is nothing", c.head, v, want)
}
