package scpi

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
)

// noReading is the magnitude from which a number is none: infinity is sent as 9.9E37 and not-a-number as
// 9.91E37. Compared numerically, since sources print 9.91E37, 9.91e37 and "9.91 E37", and with room for
// an instrument that rounds to single precision. Nothing measured is as large.
const noReading = 9.9e37 * (1 - 1e-6)

// ParseNumber reads a numeric reply: NR1 (12), NR2 (1.2), NR3 (1.2E+1), as loosely as a program
// message may write them (.5, 5., +1e-3, 9.91 E37), or non-decimal (#H1F, #Q17, #B101). Spaces around it
// are dropped. One that stands for "no reading" gives NaN and ErrNoReading.
//
// IEEE 488.2, 7.7.2 (NRf), 7.7.4 (non-decimal), 8.7.2 to 8.7.4 (NR1 to NR3).
func ParseNumber(reply string) (float64, error) {
	s := strings.Trim(reply, " \t\r\n")
	if strings.HasPrefix(s, "#") {
		return parseNonDecimal(s)
	}
	s, ok := plainDecimal(s)
	if !ok {
		return math.NaN(), errors.New("not a number")
	}
	v, err := strconv.ParseFloat(s, 64)
	if err != nil && !math.IsInf(v, 0) {
		return math.NaN(), errors.New("not a number")
	}
	if math.Abs(v) >= noReading {
		return math.NaN(), fmt.Errorf("%w (the instrument answered %s)", ErrNoReading, quote(reply))
	}
	return v, nil
}

// plainDecimal checks s against NRf and takes out the spaces that may stand around the E. It is here
// because strconv also takes hexadecimal, underscores, Inf and NaN, none of which an instrument may send.
func plainDecimal(s string) (string, bool) {
	i, digits := 0, 0
	sign := func() {
		if i < len(s) && (s[i] == '+' || s[i] == '-') {
			i++
		}
	}
	run := func() (n int) {
		for ; i < len(s) && isDigit(s[i]); i++ {
			n++
		}
		return n
	}
	space := func() {
		for i < len(s) && (s[i] == ' ' || s[i] == '\t') {
			i++
		}
	}
	sign()
	digits = run()
	if i < len(s) && s[i] == '.' {
		i++
		digits += run()
	}
	if digits == 0 {
		return "", false
	}
	mantissa := s[:i]
	if space(); i == len(s) {
		return mantissa, true
	}
	if s[i] != 'E' && s[i] != 'e' {
		return "", false
	}
	i++
	space()
	exponent := i
	sign()
	if run() == 0 || i != len(s) {
		return "", false
	}
	return mantissa + "e" + s[exponent:], true
}

func parseNonDecimal(s string) (float64, error) {
	base := 0
	if len(s) > 2 {
		switch s[1] {
		case 'H', 'h':
			base = 16
		case 'Q', 'q':
			base = 8
		case 'B', 'b':
			base = 2
		}
	}
	if base == 0 {
		return math.NaN(), errors.New("not a number")
	}
	// Base 16, 8 or 2 given outright: ParseUint then takes neither prefixes nor underscores.
	v, err := strconv.ParseUint(s[2:], base, 64)
	if err != nil {
		return math.NaN(), errors.New("not a number")
	}
	return float64(v), nil
}
