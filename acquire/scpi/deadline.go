package scpi

import (
	"context"
	"errors"
	"fmt"
	"os"
	"sync"
	"time"
)

// deadliner ends waits on a link: those begun and those to come.
type deadliner interface {
	SetDeadline(time.Time) error
}

// past is a deadline that ends a wait at once.
var past = time.Unix(1, 0)

// within runs do, which waits on the link, and ends it after timeout or when ctx ends, whichever is
// first. The error tells the three apart: ctx's own, os.ErrDeadlineExceeded, or do's. Where do sets
// c.patient, every read has the whole timeout anew.
func (c *Conn) within(ctx context.Context, timeout time.Duration, do func() error) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	w := &wait{conn: c, timeout: timeout}
	w.limit, w.limited = ctx.Deadline()
	if err := w.restart(); err != nil {
		return err
	}
	defer w.end()
	c.wait = w
	ended := make(chan struct{})
	stop := context.AfterFunc(ctx, func() {
		defer close(ended)
		w.giveUp()
	})
	err := do()
	c.wait = nil
	if c.opt.Pace > 0 {
		c.idle = time.Now()
	}
	if !stop() {
		<-ended // or its deadline in the past could fall upon the next exchange
	}
	late := !time.Now().Before(w.deadline)
	var nonsense *ReplyError
	switch {
	case err == nil || errors.As(err, &nonsense):
		return err
	case ctx.Err() != nil:
		return ctx.Err()
	case late && !w.ours:
		return context.DeadlineExceeded // the context's own timer may fire a moment later
	case late || errors.Is(err, os.ErrDeadlineExceeded):
		return fmt.Errorf("%w after %s", os.ErrDeadlineExceeded, timeout)
	}
	return err
}

// wait is one bounded wait on the link.
type wait struct {
	conn    *Conn
	timeout time.Duration
	limit   time.Time // the context's own deadline
	limited bool      // it has one

	mu       sync.Mutex // giveUp comes from another goroutine
	over     bool       // the context has ended
	deadline time.Time
	ours     bool        // the deadline is timeout's, not the context's
	timer    *time.Timer // closes a link that has no deadlines
}

// restart gives the wait its whole timeout, up to where the context ends.
func (w *wait) restart() error {
	w.mu.Lock()
	defer w.mu.Unlock()
	if w.over {
		return nil
	}
	w.deadline, w.ours = time.Now().Add(w.timeout), true
	if w.limited && w.limit.Before(w.deadline) {
		w.deadline, w.ours = w.limit, false
	}
	switch {
	case w.conn.link != nil:
		return w.conn.link.SetDeadline(w.deadline)
	case w.timer != nil:
		w.timer.Reset(time.Until(w.deadline))
	default:
		w.timer = time.AfterFunc(time.Until(w.deadline), func() { w.conn.rwc.Close() })
	}
	return nil
}

// giveUp ends the wait now, for good.
func (w *wait) giveUp() {
	w.mu.Lock()
	defer w.mu.Unlock()
	w.over = true
	if w.conn.link == nil {
		w.conn.rwc.Close()
		return
	}
	w.conn.link.SetDeadline(past)
}

// end lets the link go on without a deadline.
func (w *wait) end() {
	if w.conn.link == nil {
		w.timer.Stop()
		return
	}
	w.conn.link.SetDeadline(time.Time{})
}

// pulse is the link's reading side.
type pulse struct{ c *Conn }

// Read reads from the link, within the whole timeout where the reply may come in pieces.
func (p pulse) Read(b []byte) (int, error) {
	if p.c.patient && p.c.wait != nil {
		if err := p.c.wait.restart(); err != nil {
			return 0, err
		}
	}
	return p.c.rwc.Read(b)
}
