package scpi

import (
	"errors"
	"strings"
)

// ParseString reads a string reply: text between double quotes, an inner quote doubled. Single quotes
// are taken too, as in a program message. IEEE 488.2, 7.7.5 and 8.7.8.
func ParseString(reply string) (string, error) {
	s := strings.Trim(reply, " \t\r\n")
	if s == "" || s[0] != '"' && s[0] != '\'' {
		return "", errors.New("not a string: it does not begin with a quote")
	}
	text, rest, err := cutString(s)
	if err != nil {
		return "", err
	}
	if rest != "" {
		return "", errors.New("not one string: more follows the closing quote")
	}
	return text, nil
}

// cutString takes the quoted string at the head of s.
func cutString(s string) (text, rest string, err error) {
	q := s[0]
	var b strings.Builder
	for i := 1; i < len(s); i++ {
		if s[i] != q {
			b.WriteByte(s[i])
			continue
		}
		if i+1 < len(s) && s[i+1] == q {
			b.WriteByte(q)
			i++
			continue
		}
		return b.String(), s[i+1:], nil
	}
	return "", "", errors.New("not a string: its closing quote is missing")
}
