package quantity

import (
	"math"
	"strings"
	"unicode/utf8"
)

// The prefixes run from femto to giga: nothing on a switching node needs more.
const (
	leastPower = -15
	mostPower  = 9
)

// prefixes holds the prefix of 10^(leastPower + 3 i) at i, as printed. Micro is U+00B5.
var prefixes = [...]string{"f", "p", "n", "\u00b5", "m", "", "k", "M", "G"}

// prefixOf is the prefix that stands for ten to the given power; ok is false where there is none.
func prefixOf(power int) (prefix string, ok bool) {
	if power < leastPower || power > mostPower || power%3 != 0 {
		return "", false
	}
	return prefixes[(power-leastPower)/3], true
}

// cutPrefix takes a prefix off the head of s. Micro may be u, U+00B5 or the Greek mu U+03BC.
func cutPrefix(s string) (power int, rest string, ok bool) {
	r, n := utf8.DecodeRuneInString(s)
	if r == 'u' || r == '\u03bc' {
		r = '\u00b5'
	}
	if n == 0 || r == utf8.RuneError {
		return 0, s, false
	}
	for i, p := range prefixes {
		if p == string(r) {
			return leastPower + 3*i, s[n:], true
		}
	}
	return 0, s, false
}

// cutMark takes off the head of s the letter that marks the decimal point of a letter code: a prefix, K
// for kilo, or the unit's own mark.
func cutMark(s string, unit Unit) (power int, rest string, ok bool) {
	if power, rest, ok = cutPrefix(s); ok {
		return power, rest, true
	}
	if rest, ok = strings.CutPrefix(s, "K"); ok {
		return 3, rest, true
	}
	if mark := unit.facts().mark; mark != "" {
		if rest, ok = strings.CutPrefix(s, mark); ok {
			return 0, rest, true
		}
	}
	return 0, s, false
}

// engineering is the power of ten, a multiple of three, that leaves one to three digits before the point of
// a number whose first digit counts 10^exp. ok is false where the unit has no prefix for it: such numbers
// are written with an exponent. A unit without prefixes is written out from 0.0001 up to 999999.
func engineering(exp int, unit Unit) (power int, prefix string, ok bool) {
	if !unit.facts().prefixed {
		return 0, "", -4 <= exp && exp < 6
	}
	power = floorDiv(exp, 3) * 3
	prefix, ok = prefixOf(power)
	return power, prefix, ok
}

// Scale chooses the prefix for a column of numbers whose largest magnitude is largest, so that the head can
// say "L / nH" and the rows hold plain numbers: factor is what each value is multiplied by, prefix what goes
// before the unit's symbol. Scale(4.7e-7) is 1e9, "n".
//
// Zero, NaN and infinity give 1, "". Beyond the prefixes, the outermost is kept.
func Scale(largest float64) (factor float64, prefix string) {
	largest = math.Abs(largest)
	if largest == 0 || math.IsNaN(largest) || math.IsInf(largest, 0) {
		return 1, ""
	}
	// The decimal text has the exact exponent; a logarithm may miss it by one at a power of ten.
	power := floorDiv(decompose(largest, -1).exp, 3) * 3
	power = min(mostPower, max(leastPower, power))
	prefix, _ = prefixOf(power)
	return math.Pow10(-power), prefix
}

func floorDiv(a, b int) int { return int(math.Floor(float64(a) / float64(b))) }
