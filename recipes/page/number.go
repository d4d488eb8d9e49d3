package page

import (
	"math"
	"strconv"
	"strings"

	"ringbook/snubber/quantity"
)

// digits is how many significant digits a value without uncertainty is shown with.
const digits = 4

// scale shows numbers in one unit with one SI prefix: those of a column, or a value and its interval.
type scale struct {
	factor float64 // what a number in the SI unit is multiplied by
	symbol string  // the unit's symbol with its prefix; "" for a pure number
}

// percent is the scale of a fraction shown in percent.
var percent = scale{100, "%"}

// scaleOf picks the prefix that suits the largest of the cells.
func scaleOf(unit quantity.Unit, cells ...cell) scale {
	if unit == quantity.Ratio || unit == quantity.Temperature { // these take no prefix
		return scale{1, unit.Symbol()}
	}
	largest := 0.0
	for _, x := range cells {
		for _, v := range []float64{x.value, x.u} {
			if a := math.Abs(v); x.full && a > largest && !math.IsInf(a, 0) {
				largest = a
			}
		}
	}
	factor, prefix := quantity.Scale(largest)
	return scale{factor, prefix + unit.Symbol()}
}

// withUnit puts the unit after a number, not to be parted from it.
func (s scale) withUnit(n string) string {
	if s.symbol == "" {
		return n
	}
	return n + "\u00a0" + s.symbol
}

// number writes a value known to a few digits only, without the zeros at its end.
func (s scale) number(v float64) string {
	if s.symbol == "" && v == math.Trunc(v) && math.Abs(v) < 1e15 {
		return strconv.FormatFloat(v, 'f', 0, 64)
	}
	return trimZeros(s.rounded(v))
}

func (s scale) rounded(v float64) string {
	return quantity.Format(v*s.factor, quantity.Ratio, digits)
}

// measured writes value(uncertainty), or the value alone where no uncertainty is stated.
func (s scale) measured(x cell) string {
	if x.u == 0 {
		return s.number(x.value)
	}
	return quantity.FormatUncertain(x.value*s.factor, x.u*s.factor, quantity.Ratio)
}

// bound writes an end of an interval to the decimal place of the value's uncertainty u.
func (s scale) bound(v, u float64) string {
	if u > 0 {
		n := quantity.FormatUncertain(v*s.factor, u*s.factor, quantity.Ratio)
		if before, after, ok := strings.Cut(n, "("); ok && strings.HasSuffix(after, ")") {
			return before
		}
	}
	return s.number(v)
}

// interval writes "low to high", each with the unit when units is set.
func (s scale) interval(x cell, units bool) string {
	low, high := s.bound(x.low, x.u), s.bound(x.high, x.u)
	if units {
		low, high = s.withUnit(low), s.withUnit(high)
	}
	return low + " to " + high
}

// alike writes the numbers of a column with as many decimals as the one that needs most has, but none with
// more than its significant digits allow: 48.0 beside 48.5, 400 beside 0.001.
func (s scale) alike(values []float64) func(float64) string {
	most := 0
	for _, v := range values {
		most = max(most, decimals(s.number(v)))
	}
	return func(v float64) string {
		n, full := s.number(v), s.rounded(v)
		if extra := decimals(full) - most; extra > 0 && !strings.Contains(full, "e") {
			full = full[:len(full)-extra]
		}
		if decimals(full) < decimals(n) || decimals(full) == 0 {
			return n
		}
		return strings.TrimSuffix(full, ".")
	}
}

// decimals counts the digits after the point; none for a number with an exponent.
func decimals(n string) int {
	_, after, ok := strings.Cut(n, ".")
	if !ok || strings.Contains(after, "e") {
		return 0
	}
	return len(after)
}

func trimZeros(n string) string {
	if decimals(n) == 0 {
		return n
	}
	return strings.TrimSuffix(strings.TrimRight(n, "0"), ".")
}
