package quantity

import (
	"math"
	"strconv"
	"strings"
)

// Format writes v (SI unit) with an SI prefix and the unit's symbol, rounded to the given number of
// significant digits: Format(4.7e-10, Capacitance, 3) is "470 pF". With digits <= 0 it writes as many digits
// as it takes to read back exactly v. Rounding carries into the prefix: 999.95 V to four digits is "1.000 kV".
//
// With fewer digits than stand before the point, zeros fill up (4.7e-10 to one digit is "500 pF"). Zero is
// "0 F". NaN and infinity are "NaN", "Inf" and "-Inf". What no prefix from femto to giga brings between 1 and
// 999, and a unit without prefixes below 0.0001 or from a million, is written with an exponent: "1.23e-18 F".
func Format(v float64, unit Unit, digits int) string {
	switch {
	case math.IsNaN(v):
		return "NaN"
	case math.IsInf(v, 1):
		return "Inf"
	case math.IsInf(v, -1):
		return "-Inf"
	case v == 0:
		return withUnit("0", "", unit)
	}
	d := decompose(math.Abs(v), min(digits, 17)-1)
	scale := scaleOf(d.exp, unit)
	return withUnit(sign(v)+d.place(scale.power)+scale.exponent, scale.prefix, unit)
}

// scale is how a number's power of ten is written: as a prefix or as an exponent.
type scale struct {
	power    int    // the number is written over ten to this power
	prefix   string // "" also when there is none
	exponent string // "e-18"; "" when the prefix says it
}

func scaleOf(exp int, unit Unit) scale {
	if power, prefix, ok := engineering(exp, unit); ok {
		return scale{power, prefix, ""}
	}
	return scale{exp, "", "e" + strconv.Itoa(exp)}
}

func withUnit(number, prefix string, unit Unit) string {
	if unit.Symbol() == "" {
		return number
	}
	return number + " " + prefix + unit.Symbol()
}

func sign(v float64) string {
	if v < 0 {
		return "-"
	}
	return ""
}

// decimal is a positive number as decimal digits d1 d2 d3 ..., worth d1.d2d3... times 10^exp.
type decimal struct {
	digits string
	exp    int
}

// decompose rounds v > 0 to 1 + precision digits, or with a negative precision takes the fewest that read
// back as v. The exponent is that of the rounded number: a carry is already in it.
func decompose(v float64, precision int) decimal {
	mantissa, exponent, _ := strings.Cut(strconv.FormatFloat(v, 'e', max(precision, -1), 64), "e")
	exp, _ := strconv.Atoi(exponent)
	return decimal{strings.Replace(mantissa, ".", "", 1), exp}
}

// place writes the number over ten to the given power.
func (d decimal) place(power int) string { return pointAfter(d.digits, d.exp-power+1) }

// pointAfter puts the decimal point after the first n digits, adding zeros at either end as needed.
func pointAfter(digits string, n int) string {
	switch {
	case n <= 0:
		return "0." + strings.Repeat("0", -n) + digits
	case n >= len(digits):
		return digits + strings.Repeat("0", n-len(digits))
	}
	return digits[:n] + "." + digits[n:]
}
