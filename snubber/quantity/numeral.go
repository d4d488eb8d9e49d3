package quantity

import (
	"errors"
	"strconv"
	"strings"
)

// numeral is a decimal number cut from the head of a string and not yet converted.
type numeral struct {
	sign     string // "" or "-"
	whole    string // digits before the point
	fraction string // digits after the point
	point    bool
	exponent string // as strconv reads it; "": none
}

// some says whether there is at least one digit.
func (n numeral) some() bool { return n.whole != "" || n.fraction != "" }

// cutNumeral takes a number off the head of s. Where there are no digits, a sign and a point may still
// have been taken.
func cutNumeral(s string) (n numeral, rest string) {
	switch {
	case strings.HasPrefix(s, "-"):
		n.sign, s = "-", s[1:]
	case strings.HasPrefix(s, "\u2212"): // the minus sign of typeset text
		n.sign, s = "-", s[len("\u2212"):]
	case strings.HasPrefix(s, "+"):
		s = s[1:]
	}
	n.whole, s = cutDigits(s)
	if strings.HasPrefix(s, ".") {
		n.point = true
		n.fraction, s = cutDigits(s[1:])
	}
	if n.some() {
		n.exponent, s = cutExponent(s)
	}
	return n, s
}

// cutExponent takes e or E, a sign and digits off the head of s; an e without digits stays.
func cutExponent(s string) (exponent, rest string) {
	if s == "" || (s[0] != 'e' && s[0] != 'E') {
		return "", s
	}
	body, sign := s[1:], ""
	if body != "" && (body[0] == '-' || body[0] == '+') {
		sign, body = body[:1], body[1:]
	}
	digits, body := cutDigits(body)
	if digits == "" {
		return "", s
	}
	return sign + digits, body
}

func cutDigits(s string) (digits, rest string) {
	i := 0
	for i < len(s) && '0' <= s[i] && s[i] <= '9' {
		i++
	}
	return s[:i], s[i:]
}

// errRange is a number that a float64 cannot hold.
var errRange = errors.New("it is beyond the numbers a computer holds")

// scaled converts the numeral times ten to the given power, once and correctly rounded. A numeral with an
// exponent of its own takes no other power.
func (n numeral) scaled(power int) (float64, error) {
	exponent := n.exponent
	if exponent == "" {
		exponent = strconv.Itoa(power)
	}
	v, err := strconv.ParseFloat(n.sign+n.whole+"."+n.fraction+"e"+exponent, 64)
	if err != nil {
		return 0, errRange
	}
	if v == 0 {
		if strings.Trim(n.whole+n.fraction, "0") != "" {
			return 0, errRange
		}
		return 0, nil // never minus zero
	}
	return v, nil
}
