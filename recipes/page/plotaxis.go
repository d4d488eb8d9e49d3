package page

import (
	"errors"
	"fmt"
	"math"
	"strings"

	"ringbook/snubber/quantity"
)

// axisScale is how an axis places values.
type axisScale uint8

const (
	linear axisScale = iota
	logarithmic
	category
)

// Axis is what a plot shows along one direction: LinearAxis, LogAxis or CategoryAxis makes it. The label reads
// "quantity / unit" with one SI prefix (SI Brochure, 9th edition, 5.4.1).
type Axis struct {
	name   string
	csv    string
	unit   quantity.Unit
	scale  axisScale
	symbol string  // a unit not in package quantity, with factor
	factor float64 // what an SI value is multiplied by to be in symbol; 0: symbol is not set
	words  []string
}

// LinearAxis is an axis with equal steps. The csv name carries unscaled SI values and so ends with the unit.
func LinearAxis(name string, unit quantity.Unit, csv string) Axis {
	return Axis{name: axisName(name), csv: csv, unit: unit}
}

// LogAxis is an axis with equal ratios: values must be above zero.
func LogAxis(name string, unit quantity.Unit, csv string) Axis {
	return Axis{name: axisName(name), csv: csv, unit: unit, scale: logarithmic}
}

// CategoryAxis is a horizontal axis of categories in the order given, such as revisions. Values along it count
// from 0.
func CategoryAxis(name, csv string, categories ...string) Axis {
	words := make([]string, len(categories))
	for i, c := range categories {
		words[i] = plain(c)
	}
	return Axis{name: axisName(name), csv: csv, scale: category, words: words}
}

// In shows the axis in a unit that package quantity does not have: its symbol, and what an SI value is
// multiplied by to be in it. Squared nanoseconds are In("ns\u00b2", 1e18), levels In("dB(\u00b5V)", 1).
func (a Axis) In(symbol string, perSI float64) Axis {
	a.symbol, a.factor = plain(symbol), perSI
	if perSI == 0 {
		a.factor = math.NaN()
	}
	return a
}

func axisName(s string) string { return strings.TrimSpace(plain(s)) }

func (a Axis) check() error {
	if a.factor != 0 && !(a.factor >= 1e-30 && a.factor <= 1e30) {
		return fmt.Errorf("%q is to be shown in %q, %g of them to the SI unit; give a factor from 1e-30 to 1e30", a.name, a.symbol, a.factor)
	}
	return nil
}

// plottable says that v can be shown: a number, and none so large or small that arithmetic with it would fail.
func plottable(v float64) bool { a := math.Abs(v); return a <= 1e250 && (a >= 1e-250 || a == 0) }

// checkValues finds what a logarithmic axis or one of categories cannot show.
func (a Axis) checkValues(values []float64) error {
	if a.scale == linear {
		return nil
	}
	for i, v := range values {
		switch {
		case a.scale == category && (v < -0.5 || v > float64(len(a.words))-0.5):
			return fmt.Errorf("%s is %g at index %d, and there are %d categories, counted from 0", a.name, v, i, len(a.words))
		case a.scale == logarithmic && v <= 0 && plottable(v):
			return fmt.Errorf("%s is %g at index %d, and its axis is logarithmic; leave the point out or take a linear axis", a.name, v, i)
		}
	}
	return nil
}

// at fills in a nil x on an axis of categories.
func (a Axis) at(x []float64, n int) []float64 {
	if x != nil || a.scale != category {
		return x
	}
	x = make([]float64, n)
	for i := range x {
		x[i] = float64(i)
	}
	return x
}

// checkX checks a series' horizontal values, n of which are needed.
func (a Axis) checkX(x []float64, n int) error {
	switch {
	case x == nil && n > 0 && a.scale != category:
		return errors.New("x is nil; only an axis of categories can do without")
	case a.scale == category && x == nil && n != len(a.words):
		return fmt.Errorf("%d values for %d categories; give NaN where there is none", n, len(a.words))
	case x != nil && len(x) != n:
		return fmt.Errorf("%d values of x for %d of y; give as many", len(x), n)
	}
	return a.checkValues(x)
}

// text writes a value of the axis with its unit, for Alt.
func (a Axis) text(v float64) string {
	switch {
	case a.scale == category:
		if i := int(v); v >= 0 && v < float64(len(a.words)) {
			return a.words[i]
		}
		return quantity.Format(v, quantity.Ratio, 3)
	case a.factor != 0:
		return scale{a.factor, a.symbol}.withUnit(trimZeros(quantity.Format(v*a.factor, quantity.Ratio, 3)))
	}
	s := quantity.Format(v, a.unit, 3)
	number, unit, ok := strings.Cut(s, " ")
	if !ok {
		return trimZeros(s)
	}
	return trimZeros(number) + "\u00a0" + unit
}

// reach is the range of values an axis must show.
type reach struct {
	low, high float64
	any       bool
	pad       bool // something would be cut in half at the edge
	positive  bool // the axis is logarithmic: what is not above zero, such as an error bar's end, cannot be shown
}

func (r *reach) see(values ...float64) {
	for _, v := range values {
		if !plottable(v) || r.positive && v <= 0 {
			continue
		}
		if !r.any {
			r.low, r.high, r.any = v, v, true
		}
		r.low, r.high = math.Min(r.low, v), math.Max(r.high, v)
	}
}
