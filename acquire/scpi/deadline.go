package scpi

import (
	"context"
	"errors"
	"fmt"
	"os"
	"time"
)

// deadliner ends waits on a link: those begun and those to come.
type deadliner interface {
	SetDeadline(time.Time) error
}

// past is a deadline that ends a wait at once.
var past = time.Unix(1, 0)

// within runs do, which waits on the link, and ends it after timeout or when ctx ends, whichever is
// first. The error tells the three apart: ctx's own, os.ErrDeadlineExceeded, or do's.
func (c *Conn) within(ctx context.Context, timeout time.Duration, do func() error) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	deadline, ours := time.Now().Add(timeout), true
	if d, ok := ctx.Deadline(); ok && d.Before(deadline) {
		deadline, ours = d, false
	}
	if c.link == nil {
		defer time.AfterFunc(time.Until(deadline), func() { c.rwc.Close() }).Stop()
	} else if err := c.link.SetDeadline(deadline); err != nil {
		return err
	} else {
		defer c.link.SetDeadline(time.Time{})
	}
	ended := make(chan struct{})
	stop := context.AfterFunc(ctx, func() {
		defer close(ended)
		if c.link == nil {
			c.rwc.Close()
			return
		}
		c.link.SetDeadline(past)
	})
	err := do()
	if !stop() {
		<-ended // or its deadline in the past could fall upon the next exchange
	}
	late := !time.Now().Before(deadline)
	var nonsense *ReplyError
	switch {
	case err == nil || errors.As(err, &nonsense):
		return err
	case ctx.Err() != nil:
		return ctx.Err()
	case late && !ours:
		return context.DeadlineExceeded // the context's own timer may fire a moment later
	case late || errors.Is(err, os.ErrDeadlineExceeded):
		return fmt.Errorf("%w after %s", os.ErrDeadlineExceeded, timeout)
	}
	return err
}
