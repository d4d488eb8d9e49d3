package scpi

import (
	"context"
	"errors"
	"fmt"
	"math"
	"os"
	"strings"
	"time"
)

// QueryFunc sends a query, reads one line and hands it to parse, which says whether it is a reply to
// it. An error of parse makes a *ReplyError and puts the Conn out of step; one that is ErrNoReading is
// handed on, the Conn in step. The error queue is emptied before QueryFunc returns, and what stood there
// is its *InstrumentError, whatever parse made of the reply.
func (c *Conn) QueryFunc(ctx context.Context, parse func(reply string) error, header string, args ...Arg) error {
	return c.query(ctx, c.line, parse, header, args)
}

// QueryNumber asks for one number. ErrNoReading (tested with errors.Is) says that there is none. With
// any error the number is NaN.
func (c *Conn) QueryNumber(ctx context.Context, header string, args ...Arg) (v float64, err error) {
	err = c.QueryFunc(ctx, func(reply string) (err error) {
		v, err = ParseNumber(reply)
		return err
	}, header, args...)
	if err != nil {
		return math.NaN(), err
	}
	return v, nil
}

// QueryString asks for one quoted string and gives it without its quotes.
func (c *Conn) QueryString(ctx context.Context, header string, args ...Arg) (s string, err error) {
	err = c.QueryFunc(ctx, func(reply string) (err error) {
		s, err = ParseString(reply)
		return err
	}, header, args...)
	return s, err
}

// QueryLine asks for one line of text and gives it as it came, without its end and the blanks around it.
func (c *Conn) QueryLine(ctx context.Context, header string, args ...Arg) (line string, err error) {
	err = c.QueryFunc(ctx, func(reply string) error {
		line = reply
		return nil
	}, header, args...)
	return line, err
}

// Identity asks *IDN? and gives the answer, which must be the four fields the standard demands: maker,
// model, serial number and firmware, separated by commas. IEEE 488.2, 10.14.
func (c *Conn) Identity(ctx context.Context) (string, error) {
	var id string
	err := c.QueryFunc(ctx, func(reply string) error {
		id = reply
		return checkIdentity(reply)
	}, "*IDN?")
	if err != nil {
		return "", err
	}
	if c.identity == "" {
		c.identity = id
	}
	return id, nil
}

func checkIdentity(reply string) error {
	if strings.Count(reply, ",") < 3 {
		return errors.New("not an instrument's identity, which is maker, model, serial number and firmware with commas between")
	}
	return nil
}

func (c *Conn) query(ctx context.Context, read func() ([]byte, error), parse func(string) error, header string, args []Arg) error {
	msg, err := c.begin(ctx, header, args)
	if err != nil {
		return err
	}
	if err := c.unasked(ctx, msg); err != nil {
		return err
	}
	reply, err := c.ask(ctx, msg, c.opt.Timeout, read)
	if err != nil {
		if why := c.whySilent(ctx, msg, err); why != nil {
			return why
		}
		return err
	}
	perr := parse(stripHeader(msg, reply))
	if perr != nil && !errors.Is(perr, ErrNoReading) {
		return c.fall(&ReplyError{Command: msg, Reply: reply, Err: perr})
	}
	if err := c.emptyQueue(ctx, msg); err != nil {
		return err
	}
	return perr
}

// begin puts a query's message together and refuses what need not be sent.
func (c *Conn) begin(ctx context.Context, header string, args []Arg) (string, error) {
	msg, err := message(header, args)
	if err != nil {
		return "", err
	}
	if !IsQuery(header) {
		return "", fmt.Errorf("query %s: its header does not end in ?, so no reply would come", quote(msg))
	}
	return msg, c.ready(ctx)
}

// probe is how long an instrument that did not answer is given to say why.
const probe = time.Second

// whySilent asks the error queue of an instrument that sent nothing at all in Options.Timeout: one that
// does not know a query queues an error and sends no reply. Since instruments answer in order, an entry
// of the queue coming back also proves that the missing reply will not come, and the Conn is in step
// again. nil: it did not say why.
func (c *Conn) whySilent(ctx context.Context, msg string, silent error) error {
	var link *LinkError
	if c.opt.NoErrorQueue || !errors.As(silent, &link) || c.link == nil || link.Got != "" || !errors.Is(link.Err, os.ErrDeadlineExceeded) {
		return nil
	}
	queue := c.readQueue(ctx, msg, min(probe, c.opt.Timeout))
	var refused *InstrumentError
	if errors.As(queue, &refused) {
		c.lost = nil
		return refused
	}
	c.fall(silent)
	return nil
}
