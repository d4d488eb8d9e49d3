package scpi

import (
	"context"
	"errors"
	"io"
	"os"
	"strings"
	"time"
)

// blanks is what may stand round a reply: blanks, line ends, and NULs.
const blanks = "\r\n \t\x00"

// pause waits until the instrument may be spoken to again.
func (c *Conn) pause(ctx context.Context) error {
	if c.opt.Pace == 0 {
		return nil
	}
	left := time.Until(c.idle.Add(c.opt.Pace))
	if left <= 0 {
		return nil
	}
	timer := time.NewTimer(left)
	defer timer.Stop()
	select {
	case <-ctx.Done():
		return ctx.Err() // nothing was sent that is not answered
	case <-timer.C:
		return nil
	}
}

// say sends a message, and reads its echo from an instrument that has one.
func (c *Conn) say(msg string) error {
	if _, err := io.WriteString(c.rwc, msg+c.opt.Terminator); err != nil {
		return err
	}
	if !c.opt.Echo || c.clearing {
		return nil
	}
	line, err := c.line()
	if err != nil {
		return err
	}
	if string(line) != strings.Trim(msg, blanks) {
		return &ReplyError{Reply: string(line), Err: errors.New("not the message repeated, as echo = true promises")}
	}
	return nil
}

// skipPrompt takes a prompt that stands before a reply, and the blanks before that.
func (c *Conn) skipPrompt() error {
	if c.opt.Prompt == "" {
		return nil
	}
	for {
		if _, _, err := skipBlanks(c.r); err != nil {
			return err
		}
		if err := c.r.UnreadByte(); err != nil {
			return err
		}
		for n := 1; n <= len(c.opt.Prompt); n++ { // byte by byte: a reply may be shorter than the prompt
			head, err := c.r.Peek(n)
			if err != nil {
				return err
			}
			if string(head) != c.opt.Prompt[:n] {
				return nil
			}
		}
		if _, err := c.r.Discard(len(c.opt.Prompt)); err != nil {
			return err
		}
	}
}

// withoutPrompt takes the prompt off what came behind a reply.
func (c *Conn) withoutPrompt(behind string) string {
	if c.opt.Prompt == "" {
		return behind
	}
	if rest, ok := strings.CutSuffix(strings.TrimRight(behind, " \r\n"), c.opt.Prompt); ok {
		return rest
	}
	return behind
}

// stripHeader takes the header off a reply of an instrument that answers FREQ? with FREQ 1.2E6 (IEEE 488.2, 8.3: a
// response header). It must be the query's own, in short form or long, or the last word of it behind a channel's
// name: ERROR 5 is no reply to FREQ?.
func stripHeader(msg, reply string) string {
	head, rest, ok := strings.Cut(reply, " ")
	if rest = strings.Trim(rest, " \t"); !ok || rest == "" || checkHeader(head) != nil {
		return reply
	}
	asked, _, _ := strings.Cut(strings.Trim(msg, blanks), "?")
	if !sameWord(lastWord(head), lastWord(asked)) {
		return reply
	}
	return rest
}

// lastWord is the last mnemonic of a header.
func lastWord(header string) string { return header[strings.LastIndexAny(header, ":*")+1:] }

// sameWord says whether one of two mnemonics is the other or its short form, which has three or four letters. Numeric
// suffixes do not count.
func sameWord(a, b string) bool {
	a, b = strings.ToUpper(strings.TrimRight(a, "0123456789")), strings.ToUpper(strings.TrimRight(b, "0123456789"))
	if len(a) > len(b) {
		a, b = b, a
	}
	return a == b && a != "" || (len(a) == 3 || len(a) == 4) && strings.HasPrefix(b, a)
}

// glance is how long an instrument without an error queue is listened to before it is asked.
const glance = 100 * time.Microsecond

// unasked looks whether something came that nobody asked for. It is for an instrument without an error queue, whose
// next reply would else be taken for what is not; with a queue, the queue's form tells.
func (c *Conn) unasked(ctx context.Context, msg string) error {
	if !c.opt.NoErrorQueue || c.link == nil {
		return nil
	}
	if c.r.Buffered() == 0 {
		if some, known := pending(c.rwc); known && !some {
			return nil // a wait, however short, takes the system a millisecond
		}
	}
	err := c.within(ctx, glance, func() error {
		_, err := c.r.Peek(1)
		return err
	})
	if err != nil && !errors.Is(err, os.ErrDeadlineExceeded) {
		return c.fall(&LinkError{Command: msg, Err: err})
	}
	came, _ := c.r.Peek(c.r.Buffered())
	if strings.Trim(c.withoutPrompt(string(came)), blanks) != "" {
		return c.fall(&ReplyError{Command: msg, Reply: string(came), Err: ErrUnasked})
	}
	_, err = c.r.Discard(len(came))
	return err
}
