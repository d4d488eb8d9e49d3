package quantity

import (
	"fmt"
	"strings"
	"unicode/utf8"
)

// Parse reads a quantity in the given unit and returns it unscaled, in the SI unit (degree Celsius for
// Temperature). It reads
//
//	470  1.2e-9          a number in the unit itself
//	470p  470 pF  48V    a number, a prefix, the unit; any of the last two left out
//	2n2  4k7  R47  3V3   a letter code, also with the unit behind it
//
// with spaces around it, and one space or more before the prefix or before the unit. Symbols are
// case-sensitive: m is milli, M is mega. K is kilo in a code and before ohm, nowhere else.
//
// Everything else is an error that quotes s and says what to write: another unit, a decimal comma, two
// prefixes, a prefix beside an exponent, NaN, infinity, a number no float64 holds, a minus sign where the unit
// has none.
func Parse(s string, unit Unit) (float64, error) {
	v, err := parse(s, unit)
	if err == nil && v < 0 && !unit.Signed() {
		return 0, refuse(s, unit, unit.Quantity()+" cannot be negative")
	}
	return v, err
}

// parse is Parse without the rule about signs.
func parse(s string, unit Unit) (float64, error) {
	text, err := trim(s, unit)
	if err != nil {
		return 0, err
	}
	n, rest := cutNumeral(text)
	power, rest, code := cutCode(&n, rest, unit)
	if !n.some() {
		return 0, refuse(s, unit, noNumber(rest, unit))
	}
	if code {
		// The prefix is spent: only the unit itself may follow.
		if tail := strings.TrimLeft(rest, spaces); tail != "" && !isUnit(tail, unit) {
			return 0, refuse(s, unit, suffixFault(tail, unit))
		}
	} else {
		var why string
		if power, why = cutSuffix(rest, unit); why != "" {
			return 0, refuse(s, unit, why)
		}
		if power != 0 && n.exponent != "" {
			return 0, refuse(s, unit, "an exponent and a prefix both scale the number; keep one")
		}
	}
	v, err := n.scaled(power)
	if err != nil {
		return 0, refuse(s, unit, err.Error())
	}
	return v, nil
}

// spaces are the blanks allowed inside a quantity: the plain space, the tab, and the no-break spaces
// that pasted text brings.
const spaces = " \t\u00a0\u2009\u202f"

// trim takes the spaces off both ends and refuses what no reading can begin with.
func trim(s string, unit Unit) (string, error) {
	text := strings.Trim(s, spaces+"\r\n")
	switch {
	case text == "":
		return "", refuse(s, unit, "nothing was given, and "+unit.expected())
	case strings.Contains(text, ","):
		return "", refuse(s, unit, "a comma was found; the decimal mark is a point, and digits are not grouped")
	}
	return text, nil
}

// cutCode completes n where rest goes on as a letter code does: the mark, then the digits after the point.
func cutCode(n *numeral, rest string, unit Unit) (power int, after string, ok bool) {
	if n.point || n.exponent != "" || !unit.facts().prefixed {
		return 0, rest, false
	}
	power, after, ok = cutMark(rest, unit)
	if !ok {
		return 0, rest, false
	}
	fraction, after := cutDigits(after)
	if fraction == "" {
		return 0, rest, false
	}
	n.fraction = fraction
	return power, after, true
}

// cutSuffix reads what follows a number, which is to be nothing, a prefix, a unit or both; why says what is
// wrong with it, or is empty.
func cutSuffix(rest string, unit Unit) (power int, why string) {
	tail := strings.TrimLeft(rest, spaces)
	if tail == "" || isUnit(tail, unit) || (unit == Resistance && tail == "R") {
		return 0, ""
	}
	if !unit.facts().prefixed {
		return 0, suffixFault(tail, unit)
	}
	power, after, ok := cutPrefix(tail)
	if !ok {
		power, after = 3, strings.TrimPrefix(tail, "K")
		ok = after != tail && (after == "" || unit == Resistance)
	}
	if ok && tail == rest {
		after = strings.TrimLeft(after, spaces) // 4.7k ohm, but not 4.7 k ohm
	}
	if !ok || (after != "" && !isUnit(after, unit)) {
		return 0, suffixFault(tail, unit)
	}
	return power, ""
}

func isUnit(s string, unit Unit) bool {
	for _, spelled := range unit.facts().spelled {
		if s == spelled {
			return true
		}
	}
	return false
}

// refuse is the one form of this package's errors about a quantity.
func refuse(s string, unit Unit, why string) error {
	return fmt.Errorf("quantity %s: %s; write for example %s", quote(s), why, unit.Example())
}

// quote quotes s for an error, cutting what would flood a terminal.
func quote(s string) string {
	const most = 60
	if len(s) <= most {
		return fmt.Sprintf("%q", s)
	}
	cut := most
	for cut > 0 && !utf8.RuneStart(s[cut]) {
		cut--
	}
	return fmt.Sprintf("%q...", s[:cut])
}
