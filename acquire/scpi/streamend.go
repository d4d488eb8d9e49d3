package scpi

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"
)

// checkEnd empties the error queue after a streamed reply, and looks whether more came than the reply says it is: what
// is left of a block whose count is too small stands at once behind it, or before the queue's reply.
func (c *Conn) checkEnd(ctx context.Context, msg string, in *incoming) error {
	if c.opt.NoErrorQueue && in.size >= 0 {
		if err := c.awaitSurplus(ctx); err != nil {
			return c.fall(&LinkError{Command: msg, Got: in.head, Err: err})
		}
	}
	behind, _ := c.r.Peek(c.r.Buffered())
	if err := in.surplus(c.withoutPrompt(string(behind))); err != nil {
		return c.fall(&ReplyError{Command: msg, Reply: in.head, Err: err})
	}
	var before string
	c.skipped = &before
	err := c.emptyQueue(ctx, msg)
	c.skipped = nil
	var nonsense *ReplyError
	if errors.As(err, &nonsense) && in.size >= 0 {
		before += nonsense.Reply
	}
	if surplus := in.surplus(before); surplus != nil {
		return c.fall(&ReplyError{Command: msg, Reply: in.head, Err: surplus})
	}
	return err
}

// surplus says what is wrong with what came after a reply. A line end, or two since some double it, may stand behind
// a block: anything else is bytes of it that its count does not know of, NULs and blanks included.
func (in *incoming) surplus(s string) error {
	if in.size < 0 {
		if s = strings.Trim(s, "\r\n \t\x00"); s != "" {
			return fmt.Errorf("more came at once after it: %s", quote(s))
		}
		return nil
	}
	if strings.Trim(s, "\r\n") == "" && strings.Count(s, "\n") <= 2 && strings.Count(s, "\r") <= 2 {
		return nil
	}
	return fmt.Errorf("after the %d bytes that its count promises came more, %s: its count is too small, or a reply came late", in.size, quote(s))
}

// awaitSurplus gives what is left of a reply a moment to come. It is for an instrument without an error queue, whose
// next reply would else be the first to meet it.
func (c *Conn) awaitSurplus(ctx context.Context) error {
	if c.link == nil {
		return nil // it could be waited for only by closing it
	}
	err := c.within(ctx, quiet, func() error {
		for c.r.Buffered() < c.r.Size() {
			if _, err := c.r.Peek(c.r.Buffered() + 1); err != nil {
				return err
			}
		}
		return nil
	})
	if err == io.EOF || errors.Is(err, os.ErrDeadlineExceeded) {
		return nil // it has closed the link or says no more: the reply is whole
	}
	return err
}
