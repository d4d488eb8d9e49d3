package acquire

import (
	"context"
	"errors"
	"fmt"
	"net"
	"os"
	"slices"

	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
	"ringbook/snubber"
)

// Station is an opened rig. It is for one goroutine at a time.
//
// A link that is lost under it is opened again, with growing waits, for as long as the rig says. The instrument that
// answers then must give the identity of before; what comes of before is thrown away; its setup is sent again, and the
// network that it held. What was being done is then done again from its start. An output is never switched for that: where
// the rig has its state query and it is not as it was switched, the work ends with a *Fault. Nothing is lost of what was
// read before, and nothing of before is taken for a reply.
type Station struct {
	instruments []*instrument
	open        Opener
	notices     []string // for the warnings of the next Take
	told        func(message string)
}

// instrument is one of the station's, in dialogue.
type instrument struct {
	Instrument
	identity string // its *IDN? answer
	conn     *scpi.Conn
	left     *scpi.InstrumentError // what its error queue held when it was opened; nil: nothing
	station  *Station
	holds    string // the command that fitted the network it holds; "": none
	switched *bool  // how its output was switched last; nil: not at all
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
	s := &Station{open: open}
	for _, description := range rig.Instruments {
		in := &instrument{Instrument: description, station: s}
		if err := in.open(ctx); err != nil {
			s.Close()
			return nil, in.fault("open", err)
		}
		s.instruments = append(s.instruments, in)
	}
	return s, nil
}

// Close closes every link. A lost one is closed already.
func (s *Station) Close() error {
	var errs []error
	for _, in := range s.instruments {
		if err := in.conn.Close(); !errors.Is(err, os.ErrClosed) && !errors.Is(err, net.ErrClosed) {
			errs = append(errs, err)
		}
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

func (in *instrument) open(ctx context.Context) error {
	link, err := in.station.open(ctx, in.Address)
	if err != nil {
		return err
	}
	if in.conn, err = in.dialogue(link); err != nil {
		return err
	}
	if err := in.greet(ctx); err != nil {
		in.conn.Close()
		return err
	}
	return nil
}

// dialogue begins one over a link. An identity heard before is that which it shall hear again.
func (in *instrument) dialogue(link wire.Link) (*scpi.Conn, error) {
	conn, err := scpi.NewConn(link, scpi.Options{
		Timeout: in.Timeout, Terminator: in.Terminator, Pace: in.Pace, Prompt: in.Prompt, Echo: in.Echo,
		NoErrorQueue: in.NoErrorQueue, Identity: in.identity,
	})
	if err != nil {
		link.Close()
	}
	return conn, err
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
	return in.setUp(ctx)
}

// setUp sends the setup.
func (in *instrument) setUp(ctx context.Context) error {
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
