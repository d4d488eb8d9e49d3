package acquire

import (
	"context"
	"errors"
	"fmt"
	"slices"

	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
	"ringbook/snubber"
)

// Station is an opened rig. It is for one goroutine at a time.
type Station struct {
	instruments []*instrument
}

// instrument is one of the station's, in dialogue.
type instrument struct {
	Instrument
	identity string // its *IDN? answer
	conn     *scpi.Conn
	left     *scpi.InstrumentError // what its error queue held when it was opened; nil: nothing
}

// Opener opens the link an address names, as wire.Open does.
type Opener func(ctx context.Context, address string) (wire.Link, error)

// Open opens every instrument of the rig, asks who it is and sends its setup. When one fails, those
// already open are closed again. Errors name the instrument and its address, and are *Fault.
func Open(ctx context.Context, rig Rig) (*Station, error) { return OpenWith(ctx, rig, wire.Open) }

// OpenWith is Open with links from open: a recorder's, a playback's.
func OpenWith(ctx context.Context, rig Rig, open Opener) (*Station, error) {
	if err := rig.Check(); err != nil {
		return nil, err
	}
	s := &Station{}
	for _, description := range rig.Instruments {
		in := &instrument{Instrument: description}
		if err := in.open(ctx, open); err != nil {
			s.Close()
			return nil, in.fault("open", err)
		}
		s.instruments = append(s.instruments, in)
	}
	return s, nil
}

// Close closes every link.
func (s *Station) Close() error {
	var errs []error
	for _, in := range s.instruments {
		errs = append(errs, in.conn.Close())
	}
	return errors.Join(errs...)
}

// Identity gives the *IDN? answer of the instrument the rig calls name; "" for none of that name.
func (s *Station) Identity(name string) string {
	for _, in := range s.instruments {
		if in.Name == name {
			return in.identity
		}
	}
	return ""
}

// Provides lists the quantities the station reads, in the order it reads them.
func (s *Station) Provides() []snubber.Quantity {
	var all []snubber.Quantity
	for _, q := range snubber.Quantities() {
		if in, _ := s.provider(q); in != nil {
			all = append(all, q)
		}
	}
	return all
}

func (s *Station) provider(q snubber.Quantity) (*instrument, Query) {
	for _, in := range s.instruments {
		if i := slices.IndexFunc(in.Readings, func(r Query) bool { return r.Quantity == q }); i >= 0 {
			return in, in.Readings[i]
		}
	}
	return nil, Query{}
}

func (in *instrument) open(ctx context.Context, open Opener) error {
	link, err := open(ctx, in.Address)
	if err != nil {
		return err
	}
	in.conn, err = scpi.NewConn(link, scpi.Options{
		Timeout: in.Timeout, Terminator: in.Terminator, Pace: in.Pace, Prompt: in.Prompt, Echo: in.Echo, NoErrorQueue: in.NoErrorQueue,
	})
	if err != nil {
		link.Close()
		return err
	}
	if err := in.greet(ctx); err != nil {
		in.conn.Close()
		return err
	}
	return nil
}

// greet asks who the instrument is and sets it up. Errors that somebody else left in its queue are not
// this session's, and a line it sent before it was asked anything is thrown away.
func (in *instrument) greet(ctx context.Context) (err error) {
	in.identity, err = in.conn.Identity(ctx)
	var left *scpi.InstrumentError
	var nonsense *scpi.ReplyError
	switch {
	case errors.As(err, &nonsense):
		if in.conn.Resync(ctx) != nil {
			return err // what it said first tells more
		}
		in.identity, err = in.conn.Identity(ctx)
	case errors.As(err, &left):
		in.left = left
		in.identity, err = in.conn.Identity(ctx)
	}
	if err != nil {
		return err
	}
	for _, m := range in.Setup {
		if err := in.send(ctx, m); err != nil {
			return fmt.Errorf("setup: %w", err)
		}
	}
	return nil
}

// send sends one message; should it be a query (*OPC?), its reply is read and dropped.
func (in *instrument) send(ctx context.Context, message string) error {
	header, args, err := scpi.ParseUnit(message)
	if err != nil {
		return err
	}
	if scpi.IsQuery(header) {
		_, err := in.conn.QueryLine(ctx, header, args...)
		return err
	}
	return in.conn.Command(ctx, header, args...)
}

// ready clears a link that an earlier failure left out of step.
func (in *instrument) ready(ctx context.Context) error {
	if in.conn.OutOfStep() == nil {
		return nil
	}
	return in.conn.Resync(ctx)
}
