package page

import "strings"

// suffix counts what stands from a number's decimal point on: digits, points, opening and closing parentheses. Figures
// are as wide as one another in the pages' type, so numbers come under each other when each is followed by what the
// longest has more, unseen.
type suffix [4]int

const suffixSigns = "0.()"

// suffixOf counts the suffix of s; an odd one (an exponent, a word) counts as none.
func suffixOf(s string) suffix {
	var n suffix
	for _, r := range s[point(s):] {
		switch {
		case r >= '0' && r <= '9':
			n[0]++
		case r == '.':
			n[1]++
		case r == '(':
			n[2]++
		case r == ')':
			n[3]++
		default:
			return suffix{}
		}
	}
	return n
}

func (n *suffix) widen(m suffix) {
	for i := range n {
		n[i] = max(n[i], m[i])
	}
}

// missing is what m lacks of n.
func (n suffix) missing(m suffix) string {
	if n == m {
		return ""
	}
	var b strings.Builder
	for i := range n {
		for range n[i] - m[i] {
			b.WriteByte(suffixSigns[i])
		}
	}
	return b.String()
}
