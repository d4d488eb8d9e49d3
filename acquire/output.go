package acquire

import (
	"context"
	"errors"
	"fmt"
	"time"

	"ringbook/acquire/scpi"
)

// ErrNoOutput says that no instrument of the rig switches the bus: a person has to.
var ErrNoOutput = errors.New("no instrument of the rig switches the bus on and off: do it by hand, or give the supply a table [instrument.NAME.output] with on and off")

// mostSettle is the longest an output may be given to settle.
const mostSettle = time.Hour

// BusSwitch is how an instrument switches what feeds the bus.
type BusSwitch struct {
	On, Off []string      // the messages that do, at least one each
	State   string        // query answered 1 or ON, 0 or OFF: whether it is on; "": it is not asked
	Settle  time.Duration // what the board is given after on, before it is read; 0: nothing
}

// check gives the first field that cannot be, by its key in the file.
func (o BusSwitch) check() (key string, err error) {
	for _, side := range []struct {
		key      string
		messages []string
	}{{"on", o.On}, {"off", o.Off}} {
		if len(side.messages) == 0 {
			return "", fmt.Errorf("its %s is missing: give the message, as in %s = \"OUTPut %s\"", side.key, side.key, map[string]string{"on": "ON", "off": "OFF"}[side.key])
		}
		for _, m := range side.messages {
			if _, _, err := scpi.ParseUnit(m); err != nil {
				return side.key, err
			}
		}
	}
	if o.State != "" {
		if err := checkQuery(o.State); err != nil {
			return "state", err
		}
	}
	if o.Settle < 0 || o.Settle > mostSettle {
		return "settle", fmt.Errorf("%s: it must be nothing to %s", o.Settle, mostSettle)
	}
	return "", nil
}

// CanSwitch says whether an instrument of the rig switches the bus.
func (s *Station) CanSwitch() bool { return s.switcher() != nil }

// Switch switches the bus on or off and waits until the instrument says that it is done: its error queue is empty,
// *OPC? is answered, and where the rig has a state query, it gives what was asked for. After on it waits for the
// output to settle. Off does not mean that the bus is discharged: see Discharged.
//
// Without an instrument that can, the error is ErrNoOutput; otherwise it is a *Fault. To switch off after ctx was
// cancelled, give it another.
func (s *Station) Switch(ctx context.Context, on bool) error {
	in := s.switcher()
	if in == nil {
		return ErrNoOutput
	}
	doing := "switch the bus off"
	if on {
		doing = "switch the bus on"
	}
	in.switched = nil // not known, until it was heard
	err := s.again(ctx, func() error {
		err := in.ready(ctx)
		if err == nil {
			err = in.turn(ctx, on)
		}
		if err != nil {
			return in.fault(doing, err)
		}
		return nil
	})
	if err != nil {
		return err
	}
	in.switched = &on
	if !on {
		return nil
	}
	return pause(ctx, in.Output.Settle)
}

func (s *Station) switcher() *instrument {
	for _, in := range s.instruments {
		if in.Output != nil {
			return in
		}
	}
	return nil
}

// turn sends what switches the output, and waits until it has.
func (in *instrument) turn(ctx context.Context, on bool) error {
	messages := in.Output.Off
	if on {
		messages = in.Output.On
	}
	for _, m := range messages {
		if err := in.send(ctx, m); err != nil {
			return err
		}
	}
	if !in.NoErrorQueue { // one that knows no error queue may not know this either
		if err := in.send(ctx, "*OPC?"); err != nil {
			return err
		}
	}
	return in.confirm(ctx, on)
}

// confirm asks whether the output is as it should be, where the rig says how.
func (in *instrument) confirm(ctx context.Context, on bool) error {
	if in.Output.State == "" {
		return nil
	}
	is, err := in.isOn(ctx)
	if err == nil && is != on {
		err = &stateError{on}
	}
	return err
}

// stateError is an output that is not as it should be.
type stateError struct{ on bool }

func (e *stateError) Error() string {
	if e.on {
		return "its output is off, and should be on"
	}
	return "its output is still on, and should be off"
}

// isOn asks for the output's state.
func (in *instrument) isOn(ctx context.Context) (on bool, err error) {
	err = in.ask(ctx, in.Output.State, func(reply string) error {
		v, err := scpi.ParseNumber(reply)
		switch {
		case reply == "ON" || err == nil && v == 1:
			on = true
		case reply == "OFF" || err == nil && v == 0:
		default:
			return errors.New("not a state, which is 1 or ON, 0 or OFF")
		}
		return nil
	})
	return on, err
}

// pause waits.
func pause(ctx context.Context, d time.Duration) error {
	timer := time.NewTimer(d)
	defer timer.Stop()
	select {
	case <-ctx.Done():
		return ctx.Err()
	case <-timer.C:
		return nil
	}
}
