package device

import (
	"bytes"
	"strconv"
)

// unit is one program message unit: a header and its arguments.
type unit struct {
	nodes []string // as written; one, with its asterisk, for a common command
	root  bool     // the header began with a colon
	query bool
	args  []Arg
}

// common says whether the unit is a common command such as *IDN?.
func (u unit) common() bool { return u.nodes[0][0] == '*' }

// longestMnemonic is the length of a program mnemonic that IEEE 488.2, 7.6.1.4.1 allows.
const longestMnemonic = 12

// scanner reads one program message, terminator taken off.
type scanner struct {
	rest []byte
}

func isSpace(c byte) bool { return c <= ' ' }
func isDigit(c byte) bool { return c >= '0' && c <= '9' }
func isAlpha(c byte) bool { return c|0x20 >= 'a' && c|0x20 <= 'z' }
func isWord(c byte) bool  { return isAlpha(c) || isDigit(c) || c == '_' }

// peek is the next byte, or 0 at the end; a NUL in the message is white space, so 0 is no token.
func (s *scanner) peek() byte {
	if len(s.rest) == 0 {
		return 0
	}
	return s.rest[0]
}

func (s *scanner) space() (any bool) {
	for len(s.rest) > 0 && isSpace(s.rest[0]) {
		s.rest, any = s.rest[1:], true
	}
	return any
}

// take cuts off the longest run of bytes that fit.
func (s *scanner) take(fit func(byte) bool) string {
	n := 0
	for n < len(s.rest) && fit(s.rest[n]) {
		n++
	}
	out := string(s.rest[:n])
	s.rest = s.rest[n:]
	return out
}

// unexpected is the error for the next byte where nothing fits.
func (s *scanner) unexpected() *Error {
	c := s.peek()
	switch {
	case len(s.rest) == 0:
		return Errorf(-102, "the message ends too soon")
	case c > '~':
		return Errorf(-101, "byte 0x%02X", c)
	}
	return Errorf(-102, "at %s", strconv.Quote(clip(s.rest)))
}

func clip(b []byte) string {
	const most = 20
	if len(b) > most {
		b = b[:most]
	}
	return string(b)
}

// parse reads the next unit. ok is false at the end of the message.
func (s *scanner) parse() (u unit, ok bool, err error) {
	s.space()
	if len(s.rest) == 0 {
		return unit{}, false, nil
	}
	if u, err = s.header(); err != nil {
		return unit{}, false, err
	}
	spaced := s.space()
	if c := s.peek(); len(s.rest) > 0 && c != ';' {
		if !spaced {
			return unit{}, false, s.unexpected()
		}
		if u.args, err = s.args(); err != nil {
			return unit{}, false, err
		}
	}
	if len(s.rest) > 0 {
		if s.peek() != ';' {
			return unit{}, false, Errorf(-103, "at %s", strconv.Quote(clip(s.rest)))
		}
		s.rest = s.rest[1:]
	}
	return u, true, nil
}

// header reads *WORD[?] or [:]WORD[:WORD...][?].
func (s *scanner) header() (u unit, err error) {
	prefix := ""
	switch s.peek() {
	case '*':
		prefix, s.rest = "*", s.rest[1:]
	case ':':
		u.root, s.rest = true, s.rest[1:]
	}
	for {
		if !isAlpha(s.peek()) {
			return unit{}, s.unexpected()
		}
		word := s.take(isWord)
		if len(word) > longestMnemonic {
			return unit{}, Errorf(-112, "%s", clip([]byte(word)))
		}
		u.nodes = append(u.nodes, prefix+word)
		if prefix != "" || s.peek() != ':' {
			break
		}
		s.rest = s.rest[1:]
	}
	if s.peek() == '?' {
		u.query, s.rest = true, s.rest[1:]
	}
	return u, nil
}

// args reads arguments separated by commas, up to the unit's end.
func (s *scanner) args() (list []Arg, err error) {
	for {
		s.space()
		a, err := s.arg()
		if err != nil {
			return nil, err
		}
		list = append(list, a)
		s.space()
		if s.peek() != ',' {
			return list, nil
		}
		s.rest = s.rest[1:]
	}
}

// arg reads one argument of any type of IEEE 488.2, 7.7; of expressions, what stands in one pair of parentheses.
func (s *scanner) arg() (Arg, error) {
	c := s.peek()
	switch {
	case isAlpha(c):
		return Arg{kind: wordArg, text: s.take(isWord)}, nil
	case isDigit(c), c == '+', c == '-', c == '.':
		return s.number()
	case c == '\'', c == '"':
		return s.quoted(c)
	case c == '#':
		return s.hash()
	case c == '(':
		return s.list()
	}
	return Arg{}, s.unexpected()
}

// quoted reads a string whose inner quotes are doubled.
func (s *scanner) quoted(q byte) (Arg, error) {
	var out []byte
	for i := 1; i < len(s.rest); i++ {
		if s.rest[i] != q {
			out = append(out, s.rest[i])
			continue
		}
		if i+1 < len(s.rest) && s.rest[i+1] == q {
			out = append(out, q)
			i++
			continue
		}
		s.rest = s.rest[i+1:]
		return Arg{kind: stringArg, text: string(out)}, nil
	}
	return Arg{}, Errorf(-151, "no closing quote")
}

// hash reads what begins with #: a block, or a number to the base 16, 8 or 2.
func (s *scanner) hash() (Arg, error) {
	if len(s.rest) < 2 {
		return Arg{}, s.unexpected()
	}
	c := s.rest[1]
	base := map[byte]int{'H': 16, 'Q': 8, 'B': 2}[c&^0x20]
	switch {
	case base != 0:
		s.rest = s.rest[2:]
		digits := s.take(isWord)
		v, err := strconv.ParseUint(digits, base, 53)
		if err != nil {
			return Arg{}, Errorf(-121, "#%c%s", c, clip([]byte(digits)))
		}
		return Arg{kind: numberArg, text: digits, value: float64(v)}, nil
	case c == '0': // an indefinite block reaches to the end of the message
		out := string(s.rest[2:])
		s.rest = nil
		return Arg{kind: blockArg, text: out}, nil
	case isDigit(c):
		digits := int(c - '0')
		if len(s.rest) < 2+digits {
			return Arg{}, Errorf(-161, "its length is cut short")
		}
		n, err := strconv.ParseUint(string(s.rest[2:2+digits]), 10, 31)
		body := s.rest[2+digits:]
		if err != nil || uint64(len(body)) < n {
			return Arg{}, Errorf(-161, "it is shorter than it says")
		}
		s.rest = body[n:]
		return Arg{kind: blockArg, text: string(bytes.Clone(body[:n]))}, nil
	}
	return Arg{}, Errorf(-102, "at %s", strconv.Quote(clip(s.rest)))
}
