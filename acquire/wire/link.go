package wire

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"os"
	"strconv"
	"syscall"
	"time"
)

// Link is the byte stream to one instrument. One goroutine may read while another writes; Close and
// SetDeadline may be called at any time.
type Link interface {
	io.ReadWriteCloser

	// SetDeadline ends the waits of Read and Write, those under way included, at t: they then give
	// os.ErrDeadlineExceeded. The zero time means no deadline.
	SetDeadline(t time.Time) error
}

// connectTimeout bounds opening a socket where the context does not.
const connectTimeout = 5 * time.Second

// OpenError says why a link could not be opened, and what cures it.
type OpenError struct {
	Address string // as it was given
	Problem string
	Cure    string
	Err     error // what the system said
}

// Error is one sentence: address, problem, cure.
func (e *OpenError) Error() string {
	return fmt.Sprintf("open %s: %s: %s", clip(e.Address), e.Problem, e.Cure)
}

// Unwrap gives what the system said.
func (e *OpenError) Unwrap() error { return e.Err }

// Open opens the link an address names. It waits no longer than ctx allows, and for a socket no longer
// than 5 s. Failures of the link are *OpenError; an address that is none is an error of Parse.
func Open(ctx context.Context, address string) (Link, error) {
	a, err := Parse(address)
	if err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, fmt.Errorf("open %s: %w", address, err)
	}
	if a.Device != "" {
		return openSerial(address, a)
	}
	return openTCP(ctx, address, a)
}

func openTCP(ctx context.Context, address string, a Address) (Link, error) {
	d := net.Dialer{Timeout: connectTimeout}
	conn, err := d.DialContext(ctx, "tcp", net.JoinHostPort(a.Host, strconv.Itoa(a.Port)))
	if err == nil {
		return conn, nil
	}
	e := &OpenError{Address: address, Err: err, Problem: err.Error(), Cure: "check the address, and the network between"}
	var dns *net.DNSError
	switch {
	case ctx.Err() != nil:
		return nil, fmt.Errorf("open %s: %w", address, ctx.Err())
	case errors.As(err, &dns):
		e.Problem = fmt.Sprintf("no host called %s was found", a.Host)
		e.Cure = "check the spelling, or give the instrument's IP address as its LAN menu shows it"
	case errors.Is(err, syscall.ECONNREFUSED):
		e.Problem = fmt.Sprintf("connection refused, so nothing listens at port %d", a.Port)
		e.Cure = "check that the instrument's SCPI socket is switched on, and its port"
	case errors.Is(err, syscall.EHOSTUNREACH), errors.Is(err, syscall.ENETUNREACH):
		e.Problem = "no route to the host"
		e.Cure = "check that the instrument is on, its cable in, and that it is on this network"
	case errors.Is(err, os.ErrDeadlineExceeded):
		e.Problem = "no answer in " + connectTimeout.String()
		e.Cure = "check that the instrument is on and its cable in, and that no firewall lies between"
	}
	return nil, e
}
