package acquiretest

import (
	"bufio"
	"fmt"
	"io"
	"strconv"
	"strings"
)

// event is one line of a dialogue.
type event struct {
	kind byte   // '>' sent, '<' received, '!' a read that gave nothing
	data string // the bytes; for '!' timeout or closed
	line int    // in the file
}

func (e event) String() string {
	if e.kind == '!' {
		return "! " + e.data
	}
	return fmt.Sprintf("%c %s", e.kind, strconv.QuoteToASCII(e.data))
}

// read reads a dialogue. Errors name the line.
func read(r io.Reader) ([]event, error) {
	var events []event
	in := bufio.NewScanner(r)
	in.Buffer(nil, 64<<20) // a waveform is one line
	for n := 1; in.Scan(); n++ {
		text := strings.TrimSpace(in.Text())
		if text == "" || text[0] == '#' {
			continue
		}
		kind, rest, _ := strings.Cut(text, " ")
		switch {
		case kind == ">" || kind == "<":
			data, err := strconv.Unquote(rest)
			if err != nil || data == "" {
				return nil, fmt.Errorf("dialogue line %d: %s: after %s must come a quoted string that is not empty", n, text, kind)
			}
			events = append(events, event{kind[0], data, n})
		case kind == "!" && (rest == "timeout" || rest == "closed"):
			events = append(events, event{'!', rest, n})
		default:
			return nil, fmt.Errorf("dialogue line %d: %s: a line begins with >, <, ! timeout, ! closed or #", n, text)
		}
	}
	if err := in.Err(); err != nil {
		return nil, fmt.Errorf("dialogue: %w", err)
	}
	return events, nil
}
