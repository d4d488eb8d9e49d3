package device

import (
	"strconv"
	"strings"
)

type argKind int

const (
	wordArg argKind = iota // character program data: ON, MAX, RC
	numberArg
	stringArg
	blockArg
	listArg // an expression in parentheses: (@1,3:5)
)

// Arg is one argument of a command.
type Arg struct {
	kind  argKind
	text  string
	value float64
}

// Number is a numeric argument's value. It is finite.
func (a Arg) Number() (float64, error) {
	if a.kind != numberArg {
		return 0, Errorf(-104, "%s where a number should be", clip([]byte(a.text)))
	}
	return a.value, nil
}

// Word is a word's text in upper case.
func (a Arg) Word() (string, error) {
	if a.kind != wordArg {
		return "", Errorf(-104, "%s where a word should be", clip([]byte(a.text)))
	}
	return strings.ToUpper(a.text), nil
}

// Text is a string's text, its quotes taken off.
func (a Arg) Text() (string, error) {
	if a.kind != stringArg {
		return "", Errorf(-104, "%s where a string in quotes should be", clip([]byte(a.text)))
	}
	return a.text, nil
}

// Bool reads ON, OFF, or a number that is rounded: 0 is off, anything else on (SCPI-1999, 7.3).
func (a Arg) Bool() (bool, error) {
	switch {
	case a.kind == numberArg:
		return a.value >= 0.5 || a.value <= -0.5, nil
	case a.kind == wordArg && strings.EqualFold(a.text, "ON"):
		return true, nil
	case a.kind == wordArg && strings.EqualFold(a.text, "OFF"):
		return false, nil
	case a.kind == wordArg:
		return false, Errorf(-224, "%s is neither ON nor OFF", clip([]byte(a.text)))
	}
	return false, Errorf(-104, "%s is neither ON nor OFF", clip([]byte(a.text)))
}

// number reads decimal numeric program data: NR1, NR2 or NR3 as IEEE 488.2, 7.7.2 is lenient about
// them, no white space inside.
func (s *scanner) number() (Arg, error) {
	start := s.rest
	if c := s.peek(); c == '+' || c == '-' {
		s.rest = s.rest[1:]
	}
	whole := s.take(isDigit)
	frac := ""
	if s.peek() == '.' {
		s.rest = s.rest[1:]
		frac = s.take(isDigit)
	}
	switch digits := len(whole) + len(frac); {
	case digits == 0:
		return Arg{}, Errorf(-121, "%s", clip(start))
	case digits > 255:
		return Arg{}, Errorf(-124, "%d digits", digits)
	}
	if s.peek()|0x20 == 'e' {
		s.rest = s.rest[1:]
		if c := s.peek(); c == '+' || c == '-' {
			s.rest = s.rest[1:]
		}
		exp := s.take(isDigit)
		if n, err := strconv.Atoi(exp); exp == "" {
			return Arg{}, Errorf(-121, "%s", clip(start))
		} else if err != nil || n > 32000 {
			return Arg{}, Errorf(-123, "%s", clip(start))
		}
	}
	text := string(start[:len(start)-len(s.rest)])
	if isWord(s.peek()) {
		return Arg{}, Errorf(-138, "%s", clip(start))
	}
	v, err := strconv.ParseFloat(text, 64)
	if err != nil { // all that is left to go wrong: it is too large for a float64
		return Arg{}, Errorf(-222, "%s", clip([]byte(text)))
	}
	return Arg{kind: numberArg, text: text, value: v}, nil
}
