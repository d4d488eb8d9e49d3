package quantity

import (
	"errors"
	"math"
	"strconv"
	"strings"
)

// ParseUncertain reads what FormatUncertain writes and returns value and standard uncertainty in the SI unit.
// It also reads the third form of GUM 7.2.2, 100.02147(0.00035) g, where a point in the parentheses says that
// the uncertainty is in the value's own unit. Without parentheses it reads as Parse does, with u = 0; (?) gives
// u = NaN. The value may be negative in every unit: it is an estimate. Errors are those of Parse.
func ParseUncertain(s string, unit Unit) (v, u float64, err error) {
	text, err := trim(s, unit)
	if err != nil {
		return 0, 0, err
	}
	head, tail, ok := strings.Cut(text, "(")
	if !ok {
		v, err = parse(s, unit)
		return v, 0, err
	}
	if v, u, err = parenthesised(head, tail, unit); err != nil {
		return 0, 0, refuse(s, unit, err.Error()+"; 12.34(56) means 12.34 with a standard uncertainty of 0.56")
	}
	return v, u, nil
}

// parenthesised reads a value (head) and all that follows the opening parenthesis (tail).
func parenthesised(head, tail string, unit Unit) (v, u float64, err error) {
	inner, tail, ok := strings.Cut(tail, ")")
	n, rest := cutNumeral(head)
	if !ok || !n.some() || rest != "" || n.exponent != "" {
		return 0, 0, errors.New("a value is to be followed at once by its uncertainty in parentheses")
	}
	power, err := scaleAfter(tail, unit)
	if err != nil {
		return 0, 0, err
	}
	if v, err = n.scaled(power); err != nil {
		return 0, 0, err
	}
	if inner == "?" {
		return v, math.NaN(), nil
	}
	un, rest := cutNumeral(inner)
	if !un.some() || rest != "" || un.exponent != "" || strings.Trim(inner, "0123456789.") != "" {
		return 0, 0, errors.New("the uncertainty in parentheses is to be digits")
	}
	if !un.point {
		power -= len(n.fraction) // it counts in the value's last place
	}
	u, err = un.scaled(power)
	return v, u, err
}

// scaleAfter reads the exponent or prefix, and the unit, behind the parentheses.
func scaleAfter(tail string, unit Unit) (power int, err error) {
	exponent, tail := cutExponent(tail)
	power, why := cutSuffix(tail, unit)
	switch {
	case why != "":
		return 0, errors.New(why)
	case exponent == "":
		return power, nil
	case power != 0:
		return 0, errors.New("an exponent and a prefix both scale the number; keep one")
	}
	if power, err = strconv.Atoi(exponent); err != nil {
		return 0, errRange
	}
	return power, nil
}
