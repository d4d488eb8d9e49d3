package waveform

import (
	"strconv"

	"ringbook/snubber/quantity"
)

// csvNumber reads a cell. digits counts the significant digits it is written with.
func csvNumber(cell []byte, unit quantity.Unit) (v float64, digits int, err error) {
	v, digits, ok := plainNumber(cell)
	if ok {
		return v, digits, nil
	}
	plain := len(cell) > 0
	for _, b := range cell { // ParseFloat would also read NaN and hexadecimal
		plain = plain && (b >= '0' && b <= '9' || b == '.' || b == '-' || b == '+' || b == 'e' || b == 'E')
	}
	if plain {
		if v, err := strconv.ParseFloat(string(cell), 64); err == nil {
			return v, digits, nil
		}
	}
	v, err = quantity.Parse(string(cell), unit)
	return v, digits, err
}

// tens are the powers of ten that float64 holds exactly.
var tens = [...]float64{1, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}

// plainNumber reads a decimal number where one rounding gives it: digits below 2^53 times or over a power of ten up to 22
// (W. D. Clinger, How to Read Floating Point Numbers Accurately, PLDI 1990; attribution from memory). ok is false for any
// other text; digits is counted as far as it goes.
func plainNumber(cell []byte) (v float64, digits int, ok bool) {
	rest := cell
	negative := len(rest) > 0 && rest[0] == '-'
	if negative || len(rest) > 0 && rest[0] == '+' {
		rest = rest[1:]
	}
	var whole uint64
	power, seen, point, i := 0, 0, false, 0
	for ; i < len(rest); i++ {
		b := rest[i]
		if b == '.' && !point {
			point = true
			continue
		}
		if b < '0' || b > '9' {
			break
		}
		seen++
		if digits > 0 || b != '0' {
			digits++
		}
		whole = whole*10 + uint64(b-'0') // wraps beyond 19 digits, which are refused below
		if point {
			power--
		}
	}
	if seen == 0 || digits > 19 || whole >= 1<<53 {
		return 0, digits, false
	}
	if i < len(rest) {
		if rest[i]|0x20 != 'e' {
			return 0, digits, false
		}
		e, ok := smallExponent(rest[i+1:])
		if !ok {
			return 0, digits, false
		}
		power += e
	}
	v = float64(whole)
	switch {
	case power >= 0 && power < len(tens):
		v *= tens[power]
	case power < 0 && -power < len(tens):
		v /= tens[-power]
	default:
		return 0, digits, false
	}
	if negative {
		v = -v
	}
	return v, digits, true
}

// smallExponent reads a decimal exponent of up to three digits.
func smallExponent(text []byte) (e int, ok bool) {
	negative := len(text) > 0 && text[0] == '-'
	if negative || len(text) > 0 && text[0] == '+' {
		text = text[1:]
	}
	if len(text) == 0 || len(text) > 3 {
		return 0, false
	}
	for _, b := range text {
		if b < '0' || b > '9' {
			return 0, false
		}
		e = e*10 + int(b-'0')
	}
	if negative {
		e = -e
	}
	return e, true
}
