package device

import "fmt"

// Error is an entry of the error queue: SCPI-1999 volume 2, chapter 21.8.
type Error struct {
	Code   int    // negative: the standard's own; 0: none
	Detail string // what was offending; shown after the text, inside the quotes
}

// texts holds the standard's descriptions of the codes this package and its users raise.
var texts = map[int]string{
	0:    "No error",
	-101: "Invalid character",
	-102: "Syntax error",
	-103: "Invalid separator",
	-104: "Data type error",
	-108: "Parameter not allowed",
	-109: "Missing parameter",
	-112: "Program mnemonic too long",
	-113: "Undefined header",
	-114: "Header suffix out of range",
	-121: "Invalid character in number",
	-123: "Exponent too large",
	-124: "Too many digits",
	-138: "Suffix not allowed",
	-151: "Invalid string data",
	-161: "Invalid block data",
	-171: "Invalid expression",
	-200: "Execution error",
	-221: "Settings conflict",
	-222: "Data out of range",
	-223: "Too much data",
	-224: "Illegal parameter value",
	-230: "Data corrupt or stale",
	-240: "Hardware error",
	-300: "Device-specific error",
	-350: "Queue overflow",
	-363: "Input buffer overrun",
}

// Errorf makes an error with a detail.
func Errorf(code int, format string, args ...any) *Error {
	return &Error{Code: code, Detail: fmt.Sprintf(format, args...)}
}

// Text is the standard's description of the code.
func (e *Error) Text() string {
	if t, ok := texts[e.Code]; ok {
		return t
	}
	return texts[-300]
}

// Error is the entry as the queue reports it: the code and the quoted text, cut to the 255 characters
// that the standard allows.
func (e *Error) Error() string {
	text := e.Text()
	if e.Detail != "" {
		text += ";" + e.Detail
	}
	if len(text) > 255 {
		text = text[:255]
	}
	return fmt.Sprintf(`%d,%s`, e.Code, quote(text))
}

// quote writes string response data: inner quotes are doubled, and what would break the line or is
// not ASCII is replaced by a full stop.
func quote(s string) string {
	out := []byte{'"'}
	for _, c := range []byte(s) {
		switch {
		case c == '"':
			out = append(out, '"', '"')
		case c < ' ' || c > '~':
			out = append(out, '.')
		default:
			out = append(out, c)
		}
	}
	return string(append(out, '"'))
}

// eventBit is the bit of the standard event status register that an error of this code sets:
// IEEE 488.2, 11.5.1.
func (e *Error) eventBit() uint8 {
	switch c := e.Code; {
	case c <= -100 && c > -200:
		return 32 // CME
	case c <= -200 && c > -300:
		return 16 // EXE
	case c <= -300 && c > -400, c > 0:
		return 8 // DDE
	case c <= -400 && c > -500:
		return 4 // QYE
	}
	return 0
}
