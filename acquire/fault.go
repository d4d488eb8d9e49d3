package acquire

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
)

// Fault is a failure of one instrument: what was being done, what happened, and the cure.
type Fault struct {
	Doing      string // such as "read ring_hz"
	Instrument string // the rig's name for it
	Address    string
	Err        error  // of packages scpi or wire, or a context's
	Cure       string // "" where Err says it, or where there is nothing to cure
}

// Error is one sentence.
func (f *Fault) Error() string {
	s := fmt.Sprintf("%s: instrument %s at %s: %v", f.Doing, f.Instrument, f.Address, bare(f.Err))
	if f.Cure != "" {
		s += ": " + f.Cure
	}
	return s
}

// bare is an error without the address and the cure that one of a link's opening holds.
func bare(err error) error {
	var lost *LostError
	var open *wire.OpenError
	if !errors.As(err, &lost) && errors.As(err, &open) {
		return errors.New(open.Problem)
	}
	return err
}

// Unwrap gives the failure itself.
func (f *Fault) Unwrap() error { return f.Err }

func (in *instrument) fault(doing string, err error) error {
	return &Fault{Doing: doing, Instrument: in.Name, Address: in.Address, Err: err, Cure: cure(err)}
}

func cure(err error) string {
	var open *wire.OpenError
	var lost *LostError
	var link *scpi.LinkError
	var refused *scpi.InstrumentError
	var nonsense *scpi.ReplyError
	var samples *sampleError
	switch {
	case errors.As(err, &samples):
		return samples.cure
	case errors.As(err, new(*stateError)):
		return "look at the supply; nothing was switched to mend it"
	case errors.As(err, new(*selfTestError)):
		return "its manual says what the number means"
	case errors.As(err, &lost):
		return "check its power and its cable, then go on from here; reopen in the rig file sets how long to try"
	case errors.As(err, &open):
		return open.Cure
	case errors.Is(err, scpi.ErrNoReading):
		return "check its trigger, its range and the signal"
	case errors.Is(err, context.Canceled), errors.Is(err, context.DeadlineExceeded):
		return ""
	case errors.As(err, &refused):
		return refusedCure(refused)
	case errors.As(err, &nonsense):
		return nonsenseCure(nonsense)
	case errors.As(err, &link):
		return linkCure(link)
	}
	return ""
}

func linkCure(e *scpi.LinkError) string {
	switch {
	case e.Timeout() && e.Got != "" && e.Got[0] != '#' && readable(e.Got):
		return "if that is the whole reply, have the instrument end its replies with a line feed; if not, check the cable, or give it a longer timeout in the rig file"
	case e.Timeout() && e.Got != "":
		return "check the cable and, on a serial port, the baud rate; a slow instrument needs a longer timeout in the rig file"
	case e.Timeout():
		return "check that it is on and cabled, that the address is this instrument's, and that it knows what the rig file asks and takes its terminator; a slow instrument needs a longer timeout in the rig file"
	}
	return "check that it is on and its cable in, and that no other program holds it, since many take one link at a time; then try again"
}

// nonsenseCure tells what answers there, where the reply shows it.
func nonsenseCure(e *scpi.ReplyError) string {
	switch {
	case errors.Is(e.Err, scpi.ErrOtherInstrument):
		return "nothing was read from it; check the address, and what is plugged in where"
	case errors.Is(e.Err, scpi.ErrEcho):
		return "if the instrument repeats messages before it answers, say echo = true in the rig file; if not, no instrument answers there: check the address and the cable"
	case strings.HasPrefix(e.Reply, "HTTP/") || strings.HasPrefix(e.Reply, "<"):
		return "a web server answers there, not an instrument: give the port of the instrument's SCPI socket, often 5025"
	case strings.HasPrefix(e.Reply, "SSH-"):
		return "a login server answers there, not an instrument: give the port of the instrument's SCPI socket, often 5025"
	case !readable(e.Reply):
		return "on a serial port, check baud rate, parity and data bits against the instrument's menu; elsewhere, that the address is this instrument's"
	case strings.ContainsAny(e.Reply[:min(1, len(e.Reply))], ">?$%:]") || strings.HasSuffix(strings.TrimRight(e.Err.Error(), "\" "), ">"):
		return "if the instrument writes a prompt round its replies, give it in the rig file, as in prompt = \">\"; if not, check that the address is this instrument's"
	}
	return "check that the address is this instrument's, and what the rig file asks against its programming manual"
}

// readable says whether a reply is text.
func readable(s string) bool {
	for _, c := range []byte(s) {
		if c < ' ' && c != '\t' && c != '\r' && c != '\n' || c > 0x7e {
			return false
		}
	}
	return true
}

func refusedCure(e *scpi.InstrumentError) string {
	switch scpi.ClassOf(e.Number) {
	case scpi.CommandError:
		return "it does not know this message: check the rig file against its programming manual"
	case scpi.ExecutionError:
		return "it cannot do this as it is set: check its mode and ranges, and the value sent"
	case scpi.QueryError:
		return "check that the rig file has one query where a reply is wanted, and none elsewhere"
	}
	return "see the instrument's front panel"
}
