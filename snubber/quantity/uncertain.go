package quantity

import (
	"math"
	"strconv"
	"strings"
)

// FormatUncertain writes the value v with its standard uncertainty u (both in the SI unit) in the second form
// of GUM 7.2.2: 12.34(56) nH, where the two digits in parentheses are the uncertainty's, counted in the last
// two places of the value. The uncertainty is rounded to two significant digits and the value to the same place.
// The prefix is that of the larger of the two: an uncertainty of 560 nH about 3 nH is "0(560) nH", not a value
// to its own digits.
//
// An uncertainty of zero is left out and the value written in full, as is one below about 1e-13 of the value,
// whose place a float64 does not hold. An uncertainty that is negative, infinite or NaN is not known, and written
// 470(?) pF. A value that is NaN or infinite is written as Format does.
func FormatUncertain(v, u float64, unit Unit) string {
	if u == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
		return Format(v, unit, 0)
	}
	if !(u > 0) || math.IsInf(u, 0) {
		plain := Format(v, unit, 0)
		end := strings.IndexAny(plain+" ", "e ")
		return plain[:end] + "(?)" + plain[end:]
	}
	ud := decompose(u, 1)
	place := ud.exp - 1 // ten to this power is worth one in the last place
	digits := roundAt(math.Abs(v), place)
	if len(digits) > 15 {
		return Format(v, unit, 0)
	}
	exp := ud.exp
	if digits != "0" {
		exp = max(exp, place+len(digits)-1)
	}
	s := scaleOf(exp, unit)
	point := len(digits) + place - s.power
	if digits == "0" {
		v, point = 0, min(point, 1) // no sign, and no zeros to fill up
	}
	value := sign(v) + pointAfter(digits, point)
	// Where the last place counts tens, both numbers are filled up to the unit.
	uncertainty := ud.digits + strings.Repeat("0", max(0, place-s.power))
	return withUnit(value+"("+uncertainty+")"+s.exponent, s.prefix, unit)
}

// roundAt is v >= 0 over 10^place, rounded to a whole number, in decimal digits. The rounding is of the
// exact value of v, to even at a tie.
func roundAt(v float64, place int) string {
	var text string
	switch {
	case place <= 0:
		text = strings.Replace(strconv.FormatFloat(v, 'f', -place, 64), ".", "", 1)
	case v == 0 || decompose(v, -1).exp < place-1:
		return "0"
	case decompose(v, -1).exp == place-1:
		if v > 5*math.Pow10(place-1) {
			return "1"
		}
		return "0"
	default:
		d := decompose(v, decompose(v, -1).exp-place)
		text = d.digits + strings.Repeat("0", max(0, d.exp-place+1-len(d.digits)))
	}
	if text = strings.TrimLeft(text, "0"); text == "" {
		return "0"
	}
	return text
}
