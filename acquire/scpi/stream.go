package scpi

import (
	"bufio"
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"strings"
)

// QueryBlock asks for one arbitrary block, definite or indefinite, of at most Options.MaxReply bytes, and gives
// its bytes. They go from the link into one slice, without a copy between. The waits are those of QueryBlockTo.
func (c *Conn) QueryBlock(ctx context.Context, header string, args ...Arg) ([]byte, error) {
	return c.QueryBlockInto(ctx, nil, header, args...)
}

// QueryBlockInto is QueryBlock into room, where a definite block fits its capacity: memory that was used before takes
// a long block faster than new memory does. With an error, room may hold part of a block.
func (c *Conn) QueryBlockInto(ctx context.Context, room []byte, header string, args ...Arg) (block []byte, err error) {
	err = c.QueryBlockTo(ctx, func(body io.Reader, size int64) (err error) {
		block, err = readAll(body, size, c.opt.MaxReply, room)
		return err
	}, header, args...)
	if err != nil {
		return nil, err
	}
	return block, nil
}

// QueryBlockTo asks for one arbitrary block and has take read its bytes as they come. size is the byte count in the
// block's head, as the instrument claims it: make no room for it all at once; -1 for an indefinite block, which ends
// at the first line feed. body ends where the block does; what take leaves of it is read and thrown away.
//
// Options.Timeout bounds each silence, not the whole: a long block over a slow link comes through as long as bytes
// keep coming, and a stalled one fails that long after its last byte. The context bounds the whole.
// Options.MaxReply is take's business: it has size, and reads no more than it likes.
//
// What take made of the bytes holds only where QueryBlockTo returns nil: a block may be cut off, and that its
// count was too small, or the instrument's error, is known only after its last byte. An error of take makes a
// *ReplyError and puts the Conn out of step, as with QueryFunc.
func (c *Conn) QueryBlockTo(ctx context.Context, take func(body io.Reader, size int64) error, header string, args ...Arg) error {
	return c.stream(ctx, openBlock, take, header, args)
}

// QueryTextTo is QueryBlockTo for one line of text that may be long, such as samples in ASCII; its size is -1. A
// block that holds text is taken too, since instruments differ in it.
func (c *Conn) QueryTextTo(ctx context.Context, take func(body io.Reader, size int64) error, header string, args ...Arg) error {
	return c.stream(ctx, openText, take, header, args)
}

func (c *Conn) stream(ctx context.Context, open func(*bufio.Reader) (*incoming, error), take func(io.Reader, int64) error, header string, args []Arg) error {
	msg, err := c.begin(ctx, header, args)
	if err != nil {
		return err
	}
	if err := c.pause(ctx); err != nil {
		return err
	}
	in := &incoming{}
	err = c.within(ctx, c.opt.Timeout, func() error {
		if err := c.say(msg); err != nil {
			return err
		}
		c.patient = true
		defer func() { c.patient = false }()
		if err := c.skipPrompt(); err != nil {
			return err
		}
		var err error
		if in, err = open(c.r); errors.Is(err, errNotBlock) {
			return &ReplyError{Reply: in.head + c.restOfLine(), Err: err}
		} else if err != nil {
			return err
		}
		err = take(in, in.size)
		if in.err != nil { // whatever take made of it
			return in.err
		}
		if err != nil {
			return &ReplyError{Reply: in.head, Err: err}
		}
		_, err = io.Copy(io.Discard, in)
		return err
	})
	var nonsense *ReplyError
	switch {
	case err == nil:
		return c.checkEnd(ctx, msg, in)
	case errors.As(err, &nonsense):
		return c.fall(&ReplyError{Command: msg, Reply: nonsense.Reply, Err: nonsense.Err})
	case in.got > 0 || in.size > 0:
		err = fmt.Errorf("%s: %w", in.progress(), err)
	}
	err = c.fall(&LinkError{Command: msg, Got: in.head, Err: err})
	if why := c.whySilent(ctx, msg, err); why != nil {
		return why
	}
	return err
}

// restOfLine is what has come of the line that is being read, for a quote.
func (c *Conn) restOfLine() string {
	rest, _ := c.r.Peek(c.r.Buffered())
	line, _, _ := bytes.Cut(rest, []byte("\n"))
	return strings.TrimRight(string(line), "\r")
}
