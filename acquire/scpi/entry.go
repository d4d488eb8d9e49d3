package scpi

import (
	"errors"
	"strconv"
	"strings"
)

// ParseErrorEntry reads one reply to SYSTem:ERRor?: a number, a comma and a string, `-113,"Undefined
// header"`, where 0 (some send +0) says that the queue is empty. Text without quotes is taken when it
// begins with a letter. Nothing looser is: the form is also how a late reply is told from this one.
//
// SCPI-1999, Volume 2, 21.8.
func ParseErrorEntry(reply string) (number int, text string, err error) {
	no, rest, ok := strings.Cut(strings.Trim(reply, " \t\r\n"), ",")
	if !ok {
		return 0, "", errors.New(`not an entry of the error queue, which is a number, a comma and a string`)
	}
	n, err := strconv.ParseInt(strings.Trim(no, " \t"), 10, 16) // -32768 to 32767, as the standard has it
	if err != nil {
		return 0, "", errors.New("not an entry of the error queue: it does not begin with a whole number")
	}
	rest = strings.Trim(rest, " \t")
	if rest != "" && rest[0] != '"' && rest[0] != '\'' && isMnemonic(rest[:1]) {
		return int(n), rest, nil
	}
	text, err = ParseString(rest)
	if err != nil {
		return 0, "", errors.New("not an entry of the error queue: no string follows the comma")
	}
	return int(n), text, nil
}
