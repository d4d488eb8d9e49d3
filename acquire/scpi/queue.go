package scpi

import (
	"context"
	"time"
)

// errorQuery is the long form: SCPI-1999, Volume 2, 21.8.8.
const errorQuery = "SYSTem:ERRor?"

// ReadErrors empties the error queue. What stood there is the *InstrumentError returned; nil: nothing, or the
// instrument has no queue.
func (c *Conn) ReadErrors(ctx context.Context) error {
	if err := c.ready(ctx); err != nil {
		return err
	}
	return c.emptyQueue(ctx, errorQuery)
}

// emptyQueue reads the error queue until it says 0. What stood there is the *InstrumentError returned.
func (c *Conn) emptyQueue(ctx context.Context, msg string) error {
	if c.opt.NoErrorQueue {
		return nil
	}
	return c.readQueue(ctx, msg, c.opt.Timeout)
}

func (c *Conn) readQueue(ctx context.Context, msg string, timeout time.Duration) error {
	var first *InstrumentError
	for range c.opt.MaxErrors {
		reply, err := c.ask(ctx, errorQuery, timeout, c.line)
		if err != nil {
			return err
		}
		number, text, err := ParseErrorEntry(stripHeader(errorQuery, reply))
		if err != nil {
			return c.fall(&ReplyError{Command: errorQuery, Reply: reply, Err: err})
		}
		if number == 0 {
			if first == nil {
				return nil // not first itself: a nil *InstrumentError is a non-nil error
			}
			return first
		}
		entry := InstrumentError{Command: msg, Number: number, Text: text}
		if first == nil {
			first = &entry
		} else {
			first.Then = append(first.Then, entry)
		}
	}
	first.Endless = true
	return first
}
