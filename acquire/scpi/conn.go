package scpi

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"strings"
	"time"
)

// Defaults of Options.
const (
	DefaultTimeout   = 5 * time.Second
	DefaultMaxReply  = 16 << 20 // bytes: a long capture of a scope fits
	DefaultMaxErrors = 32
)

// Options of a Conn. The zero value is right for most instruments.
type Options struct {
	Timeout      time.Duration // longest wait for one reply, of a streamed one for its next byte, where the context ends no sooner; 0: DefaultTimeout
	Terminator   string        // what ends a message sent: "\n", "\r\n" or "\r"; "": "\n"
	MaxReply     int           // longest reply kept here, bytes; 0: DefaultMaxReply
	MaxErrors    int           // most reads of the error queue after one message; 0: DefaultMaxErrors
	NoErrorQueue bool          // the instrument does not know SYSTem:ERRor?; see Staying in step for the price
	Pace         time.Duration // least time between the end of one exchange and the next message; 0: none
	Prompt       string        // what it writes before or behind its replies, such as ">"; "": nothing
	Echo         bool          // it repeats each message, as a line, before it answers
	Identity     string        // the *IDN? answer that Resync shall hear; "": the first that was heard
}

// Conn is a dialogue with one instrument. It is for one goroutine at a time; only Close may be called
// from another.
type Conn struct {
	rwc      io.ReadWriteCloser
	link     deadliner // nil where rwc has no deadlines
	r        *bufio.Reader
	opt      Options
	identity string    // the first *IDN? answer
	lost     error     // why replies can no longer be told apart; nil: in step
	wait     *wait     // the one under way; nil: none
	patient  bool      // every read has the whole timeout anew
	skipped  *string   // where line puts the blanks before the next line; nil: nowhere
	clearing bool      // Resync is under way, and echoes are as good as anything
	idle     time.Time // when the last exchange ended
}

// NewConn starts a dialogue over rwc, which the Conn then owns. Where rwc has SetDeadline, as a net.Conn
// and a wire.Link have, waits are bounded by it; anything else is closed to end a wait.
func NewConn(rwc io.ReadWriteCloser, opt Options) (*Conn, error) {
	switch opt.Terminator {
	case "":
		opt.Terminator = "\n"
	case "\n", "\r\n", "\r":
	default:
		return nil, fmt.Errorf("terminator %q: it must be LF, CR LF or CR", opt.Terminator)
	}
	if opt.Timeout < 0 || opt.MaxReply < 0 || opt.MaxErrors < 0 || opt.Pace < 0 {
		return nil, errors.New("timeout, longest reply, most errors and pace must not be negative; 0 means the default")
	}
	if opt.MaxReply == 0 {
		opt.MaxReply = DefaultMaxReply
	}
	if opt.MaxErrors == 0 {
		opt.MaxErrors = DefaultMaxErrors
	}
	link, _ := rwc.(deadliner)
	c := &Conn{rwc: rwc, link: link, opt: opt, identity: opt.Identity}
	c.SetTimeout(opt.Timeout)
	c.r = bufio.NewReader(pulse{c})
	return c, nil
}

// SetTimeout changes Options.Timeout for the exchanges to come, as for a self-test; 0 or less: DefaultTimeout.
func (c *Conn) SetTimeout(d time.Duration) {
	if d <= 0 {
		d = DefaultTimeout
	}
	c.opt.Timeout = d
}

// Close closes the link.
func (c *Conn) Close() error { return c.rwc.Close() }

// Abandon puts the Conn out of step because of err: it was closed, or its replies are of no more use.
func (c *Conn) Abandon(err error) { c.fall(err) }

// OutOfStep gives the error after which the Conn refuses to go on; nil when it is in step.
func (c *Conn) OutOfStep() error { return c.lost }

// Command sends a message that has no reply, then empties the error queue. What stood there is the
// *InstrumentError returned.
func (c *Conn) Command(ctx context.Context, header string, args ...Arg) error {
	msg, err := message(header, args)
	if err != nil {
		return err
	}
	if IsQuery(header) {
		return fmt.Errorf("command %s: it ends in ?, which asks for a reply: send it as a query", quote(msg))
	}
	if err := c.ready(ctx); err != nil {
		return err
	}
	if err := c.send(ctx, msg); err != nil {
		return err
	}
	return c.emptyQueue(ctx, msg)
}

// ready refuses what need not be begun: after a failure, and for a context that is over.
func (c *Conn) ready(ctx context.Context) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	if c.lost != nil {
		return fmt.Errorf("%w since: %w", ErrOutOfStep, c.lost)
	}
	return nil
}

// fall marks the Conn as out of step because of err, and hands err on.
func (c *Conn) fall(err error) error {
	c.lost = err
	return err
}

func (c *Conn) send(ctx context.Context, msg string) error {
	if err := c.pause(ctx); err != nil {
		return err
	}
	err := c.within(ctx, c.opt.Timeout, func() error { return c.say(msg) })
	var nonsense *ReplyError
	switch {
	case err == nil:
		return nil
	case errors.As(err, &nonsense):
		return c.fall(&ReplyError{Command: msg, Reply: nonsense.Reply, Err: nonsense.Err})
	}
	return c.fall(&LinkError{Command: msg, Err: err})
}

// ask sends msg and reads its reply with read, which gives what it got even when it fails.
func (c *Conn) ask(ctx context.Context, msg string, timeout time.Duration, read func() ([]byte, error)) (string, error) {
	if err := c.pause(ctx); err != nil {
		return "", err
	}
	var got []byte
	err := c.within(ctx, timeout, func() error {
		if err := c.say(msg); err != nil {
			return err
		}
		var err error
		got, err = read()
		return err
	})
	var nonsense *ReplyError
	switch {
	case err == nil:
	case errors.As(err, &nonsense):
		return "", c.fall(&ReplyError{Command: msg, Reply: nonsense.Reply, Err: nonsense.Err})
	case errors.Is(err, errTooLong):
		return "", c.fall(&ReplyError{Command: msg, Reply: string(got), Err: err})
	default:
		return "", c.fall(&LinkError{Command: msg, Got: string(got), Err: err})
	}
	if string(got) == strings.Trim(msg, blanks) {
		return "", c.fall(&ReplyError{Command: msg, Reply: string(got), Err: ErrEcho})
	}
	// More at once after a reply means that one of the two was for an earlier question. Which, nobody can say.
	extra, _ := c.r.Peek(c.r.Buffered())
	if more := strings.Trim(c.withoutPrompt(string(extra)), blanks); more != "" {
		return "", c.fall(&ReplyError{Command: msg, Reply: string(got), Err: fmt.Errorf("more came at once after it: %s", quote(more))})
	}
	return string(got), nil
}

// line reads a reply that is one line of text.
func (c *Conn) line() ([]byte, error) {
	if err := c.skipPrompt(); err != nil {
		return nil, err
	}
	head, skipped, err := skipBlanks(c.r)
	if c.skipped != nil {
		*c.skipped, c.skipped = skipped, nil
	}
	if err != nil {
		return nil, err
	}
	line, err := readLine(c.r, c.opt.MaxReply, []byte{head}, "\r\n")
	if err != nil {
		return line, midway(err)
	}
	for _, b := range line {
		if b < ' ' && b != '\t' || b > 0x7e {
			return line, &ReplyError{Reply: string(line), Err: errors.New("not text (on a serial port: check baud rate and parity)")}
		}
	}
	return []byte(strings.TrimRight(string(line), " \t")), nil
}
