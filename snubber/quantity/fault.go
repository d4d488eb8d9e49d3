package quantity

import (
	"fmt"
	"strings"
	"unicode/utf8"
)

// noNumber says why text without a digit at its head is no quantity.
func noNumber(rest string, unit Unit) string {
	switch strings.ToLower(rest) {
	case "nan", "inf", "infinity":
		return "a finite number was expected"
	}
	return "it has no number, and " + unit.expected()
}

// suffixFault says what is wrong with the text after a number, nearest guess first.
func suffixFault(tail string, unit Unit) string {
	if !unit.facts().prefixed {
		return unit.expected()
	}
	_, afterPrefix, prefixed := cutPrefix(tail)
	// Before the rule of two prefixes: the f of "470 pf" is a farad, not a femto.
	if foldsToUnit(tail, unit) || (prefixed && !isUnit(afterPrefix, unit) && foldsToUnit(afterPrefix, unit)) {
		return fmt.Sprintf("capitals matter (m is milli, M is mega), and %s is written %s", unit.Name(), unit.facts().spelled[0])
	}
	if prefixed {
		if _, after, again := cutPrefix(afterPrefix); again && (after == "" || isUnit(after, unit)) {
			return "two prefixes were found; keep one"
		}
	}
	first, n := utf8.DecodeRuneInString(tail)
	switch after := tail[n:]; {
	case otherUnit(tail, unit), prefixed && otherUnit(afterPrefix, unit):
		return unit.expected()
	case first == 'K' && isUnit(after, unit):
		return "the prefix kilo is a small k"
	case isUnit(after, unit) && !prefixed:
		return fmt.Sprintf("%q is no prefix here; the prefixes are f p n u m k M G", string(first))
	}
	return fmt.Sprintf("%s is neither a prefix nor a unit known here, and %s", quote(tail), unit.expected())
}

// otherUnit says whether s is the symbol of a unit other than the one asked for.
func otherUnit(s string, unit Unit) bool {
	for u := range units {
		if Unit(u) != unit && isUnit(s, Unit(u)) {
			return true
		}
	}
	return s == "R" && unit != Resistance
}

// foldsToUnit says whether s is the unit but for capitals.
func foldsToUnit(s string, unit Unit) bool {
	for _, spelled := range unit.facts().spelled {
		if strings.EqualFold(s, spelled) {
			return true
		}
	}
	return false
}
