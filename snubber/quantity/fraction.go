package quantity

import (
	"fmt"
	"math"
	"strings"
)

const fractionExample = "5% or 0.05"

// ParseFraction reads a fraction as a percentage ("5%", "0.5 %") or as a number ("0.05") and returns the number.
// A number beyond 1 without the sign is refused, since "5" may be meant as either; "150%" and "-3%" are read.
func ParseFraction(s string) (float64, error) {
	refuse := func(why string) (float64, error) {
		return 0, fmt.Errorf("fraction %s: %s; write for example %s", quote(s), why, fractionExample)
	}
	text := strings.Trim(s, spaces+"\r\n")
	switch {
	case text == "":
		return refuse("nothing was given")
	case strings.Contains(text, ","):
		return refuse("a comma was found; the decimal mark is a point")
	}
	n, rest := cutNumeral(text)
	if !n.some() {
		return refuse("a finite number or percentage was expected")
	}
	power := 0
	switch strings.TrimLeft(rest, spaces) {
	case "":
	case "%":
		if n.exponent != "" {
			return refuse("an exponent and a percent sign both scale the number; keep one")
		}
		power = -2
	default:
		return refuse("only a percent sign may follow the number")
	}
	v, err := n.scaled(power)
	if err != nil {
		return refuse(err.Error())
	}
	if power == 0 && math.Abs(v) > 1 {
		return refuse("without a percent sign it is more than the whole")
	}
	return v, nil
}

// Fraction is a part of a whole from 0 to 1, such as a tolerance. It is a flag value.
type Fraction float64

// String writes the fraction in percent, with the digits it takes to read it back; "0" for zero, which help
// texts take for "no default".
func (f Fraction) String() string {
	v := float64(f)
	switch {
	case v == 0:
		return "0"
	case math.IsNaN(v) || math.IsInf(v, 0):
		return fmt.Sprint(v)
	}
	d := decompose(math.Abs(v), -1)
	return sign(v) + d.place(-2) + "%"
}

// Set reads s as ParseFraction does and insists on 0 to 1.
func (f *Fraction) Set(s string) error {
	v, err := ParseFraction(s)
	if err != nil {
		return err
	}
	if v < 0 || v > 1 {
		return fmt.Errorf("fraction %s: it is to lie between 0 and 1 (100%%); write for example %s", quote(s), fractionExample)
	}
	*f = Fraction(v)
	return nil
}

// Type is the word that help texts show for the value.
func (Fraction) Type() string { return "fraction" }
