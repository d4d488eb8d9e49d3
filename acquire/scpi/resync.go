package scpi

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"
	"time"
)

const (
	quiet      = 100 * time.Millisecond // no byte for so long: nothing is under way any more
	staleLines = 64                     // most late replies thrown away before the identity must come
)

// Resync brings a Conn that is out of step back in step: it throws away what comes until the link is
// quiet, ends a message that may have been sent by half, asks *IDN?, throws away what is not the
// identity heard before, and empties the error queue. Instruments answer in order, so what was still to
// come has come before the identity. Where no identity was heard before, the first reply that has an
// identity's form is taken.
//
// It waits at most Options.Timeout for each of these. After an error the Conn is still out of step: open
// the link again. A link without SetDeadline cannot be cleared.
func (c *Conn) Resync(ctx context.Context) error {
	if c.link == nil {
		return fmt.Errorf("clear the link: %w: it has no deadlines; open it again", ErrOutOfStep)
	}
	if err := c.discard(ctx); err != nil {
		return fmt.Errorf("clear the link: %w", c.fall(&LinkError{Command: "*IDN?", Err: err}))
	}
	c.clearing = true
	defer func() { c.clearing = false }()
	id, err := c.ask(ctx, c.opt.Terminator+"*IDN?", c.opt.Timeout, c.identityLine)
	if err != nil {
		return fmt.Errorf("clear the link: %w", err)
	}
	c.identity, c.lost = id, nil
	var refused *InstrumentError // what the breakdown left in the queue is not news
	if err := c.emptyQueue(ctx, "*IDN?"); err != nil && !errors.As(err, &refused) {
		return fmt.Errorf("clear the link: %w", err)
	}
	return nil
}

// identityLine reads lines until one is the identity. A late block without a line end may stand before
// it on the same line.
func (c *Conn) identityLine() ([]byte, error) {
	var line []byte
	var other string // an identity that is another's
	var err error
	for range staleLines {
		line, err = readLine(c.r, c.opt.MaxReply, nil, "\r\n")
		if err != nil && other != "" && errors.Is(err, os.ErrDeadlineExceeded) {
			return line, &ReplyError{Reply: other, Err: fmt.Errorf("%w, which was %s", ErrOtherInstrument, quote(c.identity))}
		}
		if err != nil {
			return line, midway(err)
		}
		text := strings.Trim(strings.TrimPrefix(string(line), c.opt.Prompt), blanks)
		if c.identity != "" && checkText(text) == nil && checkIdentity(text) == nil {
			other = text
		}
		if c.identity != "" && strings.HasSuffix(text, c.identity) {
			return []byte(c.identity), nil
		}
		if c.identity == "" && checkText(text) == nil && checkIdentity(text) == nil {
			return []byte(text), nil
		}
	}
	want := "an instrument's identity"
	if c.identity != "" {
		want = quote(c.identity)
	}
	return line, &ReplyError{Reply: string(line), Err: fmt.Errorf("not %s, as expected", want)}
}

// discard reads until nothing has come for a while.
func (c *Conn) discard(ctx context.Context) error {
	buf := make([]byte, 64<<10) // what is left of a block may be long
	for end := time.Now().Add(c.opt.Timeout); time.Now().Before(end); {
		c.r.Discard(c.r.Buffered())
		err := c.within(ctx, quiet, func() error {
			_, err := c.r.Read(buf)
			return err
		})
		switch {
		case errors.Is(err, os.ErrDeadlineExceeded):
			return nil
		case err == io.EOF:
			return io.ErrUnexpectedEOF
		case err != nil:
			return err
		}
	}
	return errors.New("the instrument does not stop sending")
}
