package scpi

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"strconv"
	"strings"
)

// ErrNoReading says that the instrument answered with the number that stands for "no reading": 9.91E37
// (not a number) or +-9.9E37 (infinity). SCPI-1999, Volume 1, 7.2.1.4 and 7.2.1.5 [secondary copies].
var ErrNoReading = errors.New("no reading")

// ErrOutOfStep says that an earlier exchange failed and that replies can no longer be told apart.
// Resync the Conn, or open the link again.
var ErrOutOfStep = errors.New("link out of step")

// ErrOtherInstrument says that another instrument answers than before.
var ErrOtherInstrument = errors.New("another instrument answers than before")

// ErrEcho says that what answers only repeats what it is sent.
var ErrEcho = errors.New("it only repeats what was sent")

// ErrUnasked says that something came before it was asked for.
var ErrUnasked = errors.New("it came before anything was asked")

// InstrumentError is an error out of the instrument's own error queue.
type InstrumentError struct {
	Command string            // the program message after which the queue was read
	Number  int               // as the instrument gave it: negative for standard errors, positive for its own
	Text    string            // as the instrument gave it
	Then    []InstrumentError // what else stood in the queue, oldest first
	Endless bool              // the queue was not empty after the most reads allowed
}

// Entries gives what stood in the queue as the instrument wrote it, number and text, oldest first.
func (e *InstrumentError) Entries() []string {
	all := []string{e.entry()}
	for _, t := range e.Then {
		all = append(all, t.entry())
	}
	return all
}

func (e *InstrumentError) entry() string {
	return fmt.Sprintf("%d,\"%s\"", e.Number, harmless(e.Text))
}

// harmless takes out of a text what might upset a terminal.
func harmless(s string) string {
	return strings.Map(func(c rune) rune {
		if c < ' ' || c > 0x7e {
			return '.'
		}
		return c
	}, s)
}

// Error gives every entry in the instrument's words, with the class of the first.
func (e *InstrumentError) Error() string {
	var b strings.Builder
	fmt.Fprintf(&b, "instrument error %d \"%s\" (%s) after %s", e.Number, harmless(e.Text), ClassOf(e.Number), quote(e.Command))
	for _, t := range e.Then {
		fmt.Fprintf(&b, ", then %d \"%s\"", t.Number, harmless(t.Text))
	}
	if e.overflowed() {
		b.WriteString("; the queue overflowed, so later errors are lost")
	}
	if e.Endless {
		b.WriteString("; the error queue did not run empty")
	}
	return b.String()
}

func (e *InstrumentError) overflowed() bool {
	for _, t := range e.Then {
		if t.Number == queueOverflow {
			return true
		}
	}
	return e.Number == queueOverflow
}

// ReplyError says that the instrument answered something that is no reply to what was asked.
type ReplyError struct {
	Command string // the program message
	Reply   string // what came back, whole; of a block its head
	Err     error  // what is wrong with it
}

// Error quotes the beginning of the reply.
func (e *ReplyError) Error() string {
	return fmt.Sprintf("reply %s to %s: %v", quote(e.Reply), quote(e.Command), e.Err)
}

// Unwrap gives what is wrong with the reply.
func (e *ReplyError) Unwrap() error { return e.Err }

// LinkError says that the link failed, was cut off, or stayed silent too long. Err is or wraps
// context.Canceled or context.DeadlineExceeded when the caller's context ended the wait, and
// os.ErrDeadlineExceeded when Options.Timeout did.
type LinkError struct {
	Command string // the program message
	Got     string // what had come back until then
	Err     error
}

// Error says what was waited for, and what had come.
func (e *LinkError) Error() string {
	of := quote(e.Command)
	switch {
	case errors.Is(e.Err, context.Canceled):
		return fmt.Sprintf("gave up waiting for %s: %v", of, e.Err)
	case e.Timeout() && e.Got != "":
		return fmt.Sprintf("half a reply to %s: %s and then silence: %v", of, quote(e.Got), e.Err)
	case e.Timeout():
		return fmt.Sprintf("no reply to %s: %v", of, e.Err)
	case errors.Is(e.Err, io.EOF):
		return fmt.Sprintf("the instrument closed the link at %s", of)
	}
	return fmt.Sprintf("the link failed at %s: %v", of, e.Err)
}

// Unwrap gives the transport's error.
func (e *LinkError) Unwrap() error { return e.Err }

// Timeout says whether the instrument was silent for too long, as in net.Error.
func (e *LinkError) Timeout() bool {
	return errors.Is(e.Err, os.ErrDeadlineExceeded) || errors.Is(e.Err, context.DeadlineExceeded)
}

// quote shows the beginning of what came over the wire, harmless to a terminal.
func quote(s string) string {
	const most = 60
	if len(s) <= most {
		return strconv.QuoteToASCII(s)
	}
	return fmt.Sprintf("%s... (%d bytes)", strconv.QuoteToASCII(s[:most]), len(s))
}
