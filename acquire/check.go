package acquire

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"time"

	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
)

// Verdict is one line of an instrument check.
type Verdict struct {
	Instrument string        // the rig's name for it
	What       string        // open, identity, self-test, error queue, or a reading's name
	Reply      string        // as it came, without its line end; "" where there was none
	Took       time.Duration // from the question to the end of the reply, its error queue included
	OK         bool
	Problem    string // what is wrong, or of note
	Cure       string
}

// Check asks each instrument who it is, has it test itself unless the rig file says not to, asks for each reading
// once, and looks into its error queue. progress is called with each verdict as it is there; nil is allowed. A failure
// is a verdict, and the check goes on behind it; the error is the context's alone.
func (s *Station) Check(ctx context.Context, progress func(Verdict)) ([]Verdict, error) {
	c := checking{progress: progress}
	for _, in := range s.instruments {
		if err := c.instrument(ctx, in); err != nil {
			return c.verdicts, err
		}
	}
	return c.verdicts, nil
}

// CheckRig opens each instrument of the rig by itself and checks it as Station.Check does; one that cannot be opened
// is a verdict. The error is the rig's own, as of Rig.Check, or the context's.
func CheckRig(ctx context.Context, rig Rig, progress func(Verdict)) ([]Verdict, error) {
	if err := rig.Check(); err != nil {
		return nil, err
	}
	c := checking{progress: progress}
	for _, description := range rig.Instruments {
		in := &instrument{Instrument: description, station: &Station{open: wire.Open}}
		begun := time.Now()
		err := in.open(ctx)
		c.say(in, "open", "", time.Since(begun), err)
		if err != nil {
			if ctx.Err() != nil {
				return c.verdicts, ctx.Err()
			}
			continue
		}
		err = c.instrument(ctx, in)
		in.conn.Close()
		if err != nil {
			return c.verdicts, err
		}
	}
	return c.verdicts, nil
}

// checking gathers verdicts.
type checking struct {
	progress func(Verdict)
	verdicts []Verdict
}

// say gives the verdict that err makes of a question.
func (c *checking) say(in *instrument, what, reply string, took time.Duration, err error) {
	v := Verdict{Instrument: in.Name, What: what, Reply: reply, Took: took, OK: err == nil}
	if err != nil {
		v.Problem, v.Cure = err.Error(), cure(err)
		var open *wire.OpenError
		if errors.As(err, &open) {
			v.Problem, v.Cure = open.Problem, open.Cure
		}
	}
	c.add(v)
}

func (c *checking) add(v Verdict) {
	c.verdicts = append(c.verdicts, v)
	if c.progress != nil {
		c.progress(v)
	}
}

// ask has one question asked and gives its verdict; the error is the context's alone.
func (c *checking) ask(ctx context.Context, in *instrument, what string, question func() (reply string, err error)) error {
	begun, reply := time.Now(), ""
	err := in.ready(ctx)
	if err == nil {
		reply, err = question()
	}
	if ctx.Err() != nil {
		return ctx.Err()
	}
	var nonsense *scpi.ReplyError
	if reply == "" && errors.As(err, &nonsense) {
		reply = nonsense.Reply
	}
	c.say(in, what, reply, time.Since(begun), err)
	return nil
}

func (c *checking) instrument(ctx context.Context, in *instrument) error {
	err := c.ask(ctx, in, "identity", func() (string, error) { return in.conn.Identity(ctx) })
	if err != nil {
		return err
	}
	if in.NoSelfTest {
		c.add(Verdict{Instrument: in.Name, What: "self-test", OK: true, Problem: "not asked for: self_test in the rig file"})
	} else if err := c.ask(ctx, in, "self-test", func() (string, error) { return in.selfTest(ctx) }); err != nil {
		return err
	}
	for _, q := range in.Readings {
		err := c.ask(ctx, in, string(q.Quantity), func() (string, error) {
			_, raw, err := in.once(ctx, q)
			return raw, err
		})
		if err != nil {
			return err
		}
	}
	if in.NoErrorQueue {
		c.add(Verdict{Instrument: in.Name, What: "error queue", OK: true, Problem: "not asked for: error_queue = false in the rig file"})
		return nil
	}
	begun := time.Now()
	queue, err := in.queue(ctx)
	if ctx.Err() != nil {
		return ctx.Err()
	}
	v := Verdict{Instrument: in.Name, What: "error queue", Reply: strings.Join(queue, ", "), Took: time.Since(begun), OK: err == nil}
	switch {
	case err != nil:
		v.Problem, v.Cure = err.Error(), cure(err)
	case in.left != nil:
		v.Problem = "when it was opened it held, from before: " + strings.Join(in.left.Entries(), ", ")
	}
	c.add(v)
	return nil
}

// queue empties the error queue and gives its entries as they came; an error among them is an *scpi.InstrumentError.
func (in *instrument) queue(ctx context.Context) ([]string, error) {
	if err := in.ready(ctx); err != nil {
		return nil, err
	}
	err := in.conn.ReadErrors(ctx)
	var refused *scpi.InstrumentError
	switch {
	case errors.As(err, &refused):
		return refused.Entries(), err
	case err != nil:
		return nil, err
	}
	return []string{`0,"No error"`}, nil
}

// selfTestTime is what a self-test may take: some switch every relay they have.
const selfTestTime = 2 * time.Minute

// selfTest asks for *TST?, whose reply is 0 where nothing is wrong. IEEE 488.2, 10.38 [from memory].
func (in *instrument) selfTest(ctx context.Context) (reply string, err error) {
	in.conn.SetTimeout(max(selfTestTime, in.Timeout))
	defer in.conn.SetTimeout(in.Timeout)
	reply, err = in.conn.QueryLine(ctx, "*TST?")
	if err != nil {
		return reply, err
	}
	if v, err := scpi.ParseNumber(reply); err != nil || v != 0 {
		return reply, &selfTestError{reply}
	}
	return reply, nil
}

// selfTestError is a self-test that found something.
type selfTestError struct{ reply string }

func (e *selfTestError) Error() string {
	return fmt.Sprintf("its self-test says %q, and 0 would mean that nothing is wrong", e.reply)
}
