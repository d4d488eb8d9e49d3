package scpi

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// Arg is one parameter of a program message. Its makers refuse what could end the message or begin
// another; the refusal comes out of the call the Arg is given to, and nothing is sent.
type Arg struct {
	text string
	err  error
}

// Number is a decimal parameter in NR3 form: 4.7E-10.
func Number(v float64) Arg {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return Arg{err: fmt.Errorf("parameter %g: it must be a finite number", v)}
	}
	return Arg{text: formatNR3(v)}
}

// Text is a string parameter, quoted, its inner quotes doubled.
func Text(s string) Arg {
	if err := checkText(s); err != nil {
		return Arg{err: fmt.Errorf("parameter %s: %w", quote(s), err)}
	}
	return Arg{text: `"` + strings.ReplaceAll(s, `"`, `""`) + `"`}
}

// Word is a character parameter, such as ON, CHANnel1 or rc: a letter, then letters, digits and underscores.
func Word(s string) Arg {
	if !isMnemonic(s) {
		return Arg{err: fmt.Errorf("parameter %s: a word is a letter, then letters, digits and underscores", quote(s))}
	}
	return Arg{text: s}
}

// ParseUnit splits one program message unit as a person writes it, "MEASure:FREQuency? CHANnel1", into
// its header and its parameters, the latter kept as written. It refuses line ends, semicolons, control
// characters and everything beyond ASCII: one unit is one message.
func ParseUnit(unit string) (header string, args []Arg, err error) {
	unit = strings.Trim(unit, " \t")
	if err := checkText(unit); err != nil {
		return "", nil, fmt.Errorf("message %s: %w", quote(unit), err)
	}
	header, rest, _ := strings.Cut(strings.ReplaceAll(unit, "\t", " "), " ")
	if err := checkHeader(header); err != nil {
		return "", nil, fmt.Errorf("message %s: %w", quote(unit), err)
	}
	if rest = strings.Trim(rest, " "); rest != "" {
		args = []Arg{{text: rest}}
	}
	return header, args, nil
}

// IsQuery says whether a header asks for a reply.
func IsQuery(header string) bool { return strings.HasSuffix(header, "?") }

// message puts a program message together, without its terminator.
func message(header string, args []Arg) (string, error) {
	if err := checkHeader(header); err != nil {
		return "", err
	}
	var b strings.Builder
	b.WriteString(header)
	for i, a := range args {
		if a.err != nil {
			return "", fmt.Errorf("%s: %w", header, a.err)
		}
		if i == 0 {
			b.WriteByte(' ')
		} else {
			b.WriteByte(',')
		}
		b.WriteString(a.text)
	}
	return b.String(), nil
}

// checkHeader accepts a common header (*IDN?) or a simple or compound one (:SYSTem:ERRor?):
// IEEE 488.2, 7.6.1.
func checkHeader(header string) error {
	body := strings.TrimSuffix(header, "?")
	if common, ok := strings.CutPrefix(body, "*"); ok {
		if !isMnemonic(common) {
			return fmt.Errorf("header %s: after the star must come letters, as in *IDN?", quote(header))
		}
		return nil
	}
	for _, m := range strings.Split(strings.TrimPrefix(body, ":"), ":") {
		if !isMnemonic(m) {
			return fmt.Errorf("header %s: it must be words joined by colons, as in MEASure:FREQuency?", quote(header))
		}
	}
	return nil
}

func isMnemonic(s string) bool {
	for i := range len(s) {
		c := s[i]
		letter := c >= 'A' && c <= 'Z' || c >= 'a' && c <= 'z'
		if !letter && (i == 0 || !isDigit(c) && c != '_') {
			return false
		}
	}
	return s != ""
}

// checkText refuses what could end a message or begin another.
func checkText(s string) error {
	for i := range len(s) {
		switch c := s[i]; {
		case c == '\n' || c == '\r':
			return fmt.Errorf("it must not hold a line end")
		case c == ';':
			return fmt.Errorf("it must not hold a semicolon: send one message at a time")
		case c < ' ' && c != '\t' || c == 0x7f:
			return fmt.Errorf("it must not hold the control character %#02x", c)
		case c > 0x7e:
			return fmt.Errorf("it must be plain ASCII")
		}
	}
	return nil
}

// formatNR3 writes a number with digits on both sides of the point and a signed exponent.
func formatNR3(v float64) string {
	s := strconv.FormatFloat(v, 'E', -1, 64)
	mantissa, exponent, _ := strings.Cut(s, "E")
	if !strings.Contains(mantissa, ".") {
		mantissa += ".0"
	}
	return mantissa + "E" + exponent
}

func isDigit(c byte) bool { return c >= '0' && c <= '9' }

// String gives the parameter as it will be sent; "" for one that will be refused.
func (a Arg) String() string { return a.text }
