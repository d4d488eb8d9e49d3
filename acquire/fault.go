package acquire

import (
	"context"
	"errors"
	"fmt"

	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
)

// Fault is a failure of one instrument: what was being done, what happened, and the cure.
type Fault struct {
	Doing      string // such as "read ring_hz"
	Instrument string // the rig's name for it
	Address    string
	Err        error  // of packages scpi or wire, or a context's
	Cure       string // "" where Err holds it, or where there is nothing to cure
}

// Error is one sentence.
func (f *Fault) Error() string {
	s := fmt.Sprintf("%s: instrument %s at %s: %v", f.Doing, f.Instrument, f.Address, f.Err)
	var open *wire.OpenError
	if errors.As(f.Err, &open) { // which names the address too
		return fmt.Sprintf("%s: instrument %s at %s: %s: %s", f.Doing, f.Instrument, f.Address, open.Problem, open.Cure)
	}
	if f.Cure != "" {
		s += ": " + f.Cure
	}
	return s
}

// Unwrap gives the failure itself.
func (f *Fault) Unwrap() error { return f.Err }

func (in *instrument) fault(doing string, err error) error {
	return &Fault{Doing: doing, Instrument: in.Name, Address: in.Address, Err: err, Cure: cure(err)}
}

func cure(err error) string {
	var open *wire.OpenError
	var link *scpi.LinkError
	var refused *scpi.InstrumentError
	var nonsense *scpi.ReplyError
	var samples *sampleError
	switch {
	case errors.As(err, &samples):
		return samples.cure
	case errors.As(err, &open), errors.Is(err, context.Canceled), errors.Is(err, context.DeadlineExceeded):
		return ""
	case errors.As(err, &refused):
		return refusedCure(refused)
	case errors.As(err, &nonsense):
		return "check that the address is this instrument's, and what the rig file asks against its programming manual"
	case errors.As(err, &link) && link.Timeout() && link.Got != "":
		return "check the cable and, on a serial port, the baud rate; a slow instrument needs a longer timeout in the rig file"
	case errors.As(err, &link) && link.Timeout():
		return "check that it is on and cabled, and knows what the rig file asks; a slow instrument needs a longer timeout in the rig file"
	case errors.As(err, &link):
		return "check that it is on and its cable in, then try again"
	}
	return ""
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
