package acquire

import (
	"context"
	"errors"
	"fmt"
	"time"

	"ringbook/acquire/scpi"
)

// DefaultReopen is how long a lost link is opened again when the rig does not say.
const DefaultReopen = 30 * time.Second

const (
	firstWait   = 100 * time.Millisecond // between two attempts to open; it doubles
	longestWait = 3 * time.Second
	mostAgain   = 5 // most times that one piece of work is begun again after a lost link
)

// LostError says that a link was lost and did not come back.
type LostError struct {
	Within time.Duration // how long it was opened again
	First  error         // how it was lost
	Last   error         // why it did not open again
}

// Error is one sentence without a cure.
func (e *LostError) Error() string {
	return fmt.Sprintf("%v; the link was opened again for %s in vain: %v", e.First, e.Within, bare(e.Last))
}

// Unwrap gives both failures.
func (e *LostError) Unwrap() []error { return []error{e.First, e.Last} }

// again does a piece of work, and begins it again when the link of an instrument was lost under it and could be opened
// anew; once, when an instrument said nothing or nonsense and then gives its identity again. Nothing of what came before
// is kept. What happened is a notice.
func (s *Station) again(ctx context.Context, work func() error) error {
	doubtful := 0
	for begun := 1; ; begun++ {
		err := work()
		var fault *Fault
		if err == nil || ctx.Err() != nil || begun > mostAgain || !errors.As(err, &fault) {
			return err
		}
		switch dropped, odd := whatBroke(err); {
		case odd:
			if doubtful++; doubtful > 1 {
				return err
			}
		case !dropped:
			return err
		}
		in := s.named(fault.Instrument)
		if in == nil || in.conn.OutOfStep() == nil {
			return err
		}
		if e := in.ready(ctx); e != nil {
			return in.fault(fault.Doing, e)
		}
		s.notice("%s: instrument %s at %s: %v; its link is in order again, and this was begun again from its start", fault.Doing, in.Name, in.Address, bare(fault.Err))
	}
}

// whatBroke says whether a failure is a dropped link, or an odd thing that may have happened but once: silence, or what is
// no reply. Samples that came whole and are not what the rig file says will be so again.
func whatBroke(err error) (dropped, odd bool) {
	var link *scpi.LinkError
	var nonsense *scpi.ReplyError
	switch {
	case errors.As(err, new(*LostError)), errors.As(err, new(*sampleError)), errors.Is(err, scpi.ErrOtherInstrument):
		return false, false
	case errors.As(err, &link):
		return !link.Timeout(), link.Timeout()
	}
	return false, errors.As(err, &nonsense)
}

func (s *Station) named(name string) *instrument {
	for _, in := range s.instruments {
		if in.Name == name {
			return in
		}
	}
	return nil
}

// notice keeps what a person should know of, for the warnings of the next Take, and says it.
func (s *Station) notice(format string, args ...any) {
	text := fmt.Sprintf(format, args...)
	s.notices = append(s.notices, text)
	s.say(text)
}

// say tells what is going on to who asked to be told.
func (s *Station) say(text string) {
	if s.told != nil {
		s.told(text)
	}
}

// Notify has tell called with a sentence whenever a link was lost, is opened again, or came back: that takes a while,
// and a person wants to know. It is called by the goroutine that works the station.
func (s *Station) Notify(tell func(message string)) { s.told = tell }

// ready brings a link in step that an earlier failure left out of it: what is under way is thrown away and the
// identity compared; where that fails, the link is opened again.
func (in *instrument) ready(ctx context.Context) error {
	lost := in.conn.OutOfStep()
	if lost == nil {
		return nil
	}
	err := in.conn.Resync(ctx)
	if err == nil || ctx.Err() != nil || errors.Is(err, scpi.ErrOtherInstrument) {
		return err
	}
	return in.reopen(ctx, lost)
}

// reopen opens a lost link again, with growing waits, for as long as the rig says.
func (in *instrument) reopen(ctx context.Context, lost error) error {
	in.conn.Close()
	within := in.Reopen
	if within == 0 {
		within = DefaultReopen
	}
	if within < 0 {
		return lost
	}
	in.station.say(fmt.Sprintf("instrument %s at %s: %v; its link is opened again, for %s at most", in.Name, in.Address, lost, within))
	begun := time.Now()
	limited, cancel := context.WithTimeout(ctx, within)
	defer cancel()
	var last error
	for wait := firstWait; ; wait = min(2*wait, longestWait) {
		err := in.resume(limited)
		var refused *scpi.InstrumentError
		switch {
		case err == nil:
			in.station.say(fmt.Sprintf("instrument %s at %s: its link is open again after %s", in.Name, in.Address, time.Since(begun).Round(100*time.Millisecond)))
			return nil
		case ctx.Err() != nil:
			return ctx.Err()
		case errors.Is(err, scpi.ErrOtherInstrument), errors.As(err, &refused), errors.As(err, new(*stateError)):
			return err // it is back, and something else is wrong
		case last == nil || limited.Err() == nil:
			last = err
		}
		if pause(limited, wait) != nil {
			if ctx.Err() != nil {
				return ctx.Err()
			}
			return &LostError{Within: within, First: lost, Last: last}
		}
	}
}

// live says whether an output of the rig was switched on.
func (s *Station) live() bool {
	for _, in := range s.instruments {
		if in.switched != nil && *in.switched {
			return true
		}
	}
	return false
}

// resume opens the link once, throws away what comes of before, hears the same identity, and puts the instrument back
// as it was: set up, with the network it held unless the bus is on. An output is not switched: it must be as it was.
func (in *instrument) resume(ctx context.Context) error {
	link, err := in.station.open(ctx, in.Address)
	if err != nil {
		return err
	}
	conn, err := in.dialogue(link)
	if err != nil {
		return err
	}
	in.conn = conn
	back := func() error {
		if err := conn.Resync(ctx); err != nil {
			return err
		}
		if err := in.setUp(ctx); err != nil {
			return err
		}
		switch {
		case in.holds == "":
		case in.station.live():
			// A lost link switches nothing; one that lost its power too would be fitted hot.
			in.station.say(fmt.Sprintf("instrument %s is not told again to fit its network, for the bus is on: if it lost its power too, switch off and fit it anew", in.Name))
		default:
			if err := in.send(ctx, in.holds); err != nil {
				return err
			}
		}
		if in.switched != nil {
			return in.confirm(ctx, *in.switched)
		}
		return nil
	}
	if err := back(); err != nil {
		conn.Close()
		return in.stayLost(err)
	}
	return nil
}

// stayLost sees to it that a link which was closed is not taken for one in step.
func (in *instrument) stayLost(err error) error {
	in.conn.Abandon(err)
	return err
}
