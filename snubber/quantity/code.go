package quantity

import "math"

// Code writes v (SI unit) as a letter code after IEC 60062: "4k7", "470p", "2n2", "10R", "1M0", "R47", "p47".
// Codes are for ohm, farad, henry, volt, ampere and watt, and for values of up to three significant digits
// from femto to giga; Parse reads each back as exactly v. Zero is "0R", "0F" and so on.
//
// Anything else is written as Format does: in full where three digits tell it all, otherwise to four.
func Code(v float64, unit Unit) string {
	mark := unit.facts().mark
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return Format(v, unit, 0)
	}
	if v == 0 {
		return "0" + mark
	}
	d := decompose(math.Abs(v), -1)
	power, prefix, ok := codeScale(d.exp, unit)
	if len(d.digits) > 3 {
		return Format(v, unit, 4)
	}
	if !ok || mark == "" {
		return Format(v, unit, 0)
	}
	if prefix == "" {
		prefix = mark
	}
	return sign(v) + codeText(d.digits, d.exp-power+1, prefix)
}

// codeScale is engineering, but for the two decades that the standard writes with the letter in front: tenths
// of an ohm (R47) and of a picofarad (p47).
func codeScale(exp int, unit Unit) (power int, prefix string, ok bool) {
	switch {
	case unit == Resistance && exp == -1:
		return 0, "", true
	case unit == Capacitance && exp == -13:
		return -12, "p", true
	}
	return engineering(exp, unit)
}

// codeText puts the letter where the point would stand, after n digits. A single digit before the letter is
// followed by another (1M0, not 1M).
func codeText(digits string, n int, letter string) string {
	for len(digits) < n || (n == 1 && len(digits) < 2) {
		digits += "0"
	}
	return digits[:n] + letter + digits[n:]
}
