package wire

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"os"
	"sync"
	"sync/atomic"
	"time"

	"go.bug.st/serial"
)

// slice is how often a wait on a serial port looks whether its deadline has moved or the link was closed.
const slice = 20 * time.Millisecond

// serialLink gives a serial port deadlines.
type serialLink struct {
	port     serial.Port
	lock     io.Closer
	device   string
	deadline atomic.Pointer[time.Time]
	closed   atomic.Bool
	reading  sync.Mutex      // held by a Read
	writing  sync.Mutex      // held by a Write
	underway chan wroteBytes // the write that a deadline overtook; nil: none
}

type wroteBytes struct {
	n   int
	err error
}

func openSerial(address string, a Address) (Link, error) {
	lock, err := lockPort(a.Device)
	if err != nil {
		return nil, portError(address, a, err)
	}
	port, err := serial.Open(a.Device, &a.Mode)
	if err != nil {
		lock.Close()
		return nil, portError(address, a, err)
	}
	// Some instruments talk only while these lines are up. A pseudo-terminal has none, which is no fault.
	_ = port.SetDTR(true)
	_ = port.SetRTS(true)
	if err := port.ResetInputBuffer(); err != nil { // what came before nobody asked for
		port.Close()
		lock.Close()
		return nil, portError(address, a, err)
	}
	return &serialLink{port: port, lock: lock, device: a.Device}, nil
}

// Read waits for at least one byte. The port's own read gives (0, nil) when it times out; here that is
// either another turn or os.ErrDeadlineExceeded.
func (l *serialLink) Read(p []byte) (int, error) {
	l.reading.Lock()
	defer l.reading.Unlock()
	if len(p) == 0 {
		return 0, nil
	}
	for {
		wait, err := l.left()
		if err != nil {
			return 0, err
		}
		if err := l.port.SetReadTimeout(wait); err != nil {
			return 0, l.gone(err)
		}
		n, err := l.port.Read(p)
		if n > 0 {
			return n, nil
		}
		if err != nil {
			return 0, l.gone(err)
		}
	}
}

// Write writes all of p. The port's own write knows no deadline, so it runs beside, and where a deadline
// overtakes it the link takes no further write until it has ended.
func (l *serialLink) Write(p []byte) (int, error) {
	l.writing.Lock()
	defer l.writing.Unlock()
	if l.underway == nil {
		if _, err := l.left(); err != nil {
			return 0, err
		}
		return l.await(l.start(p))
	}
	if _, err := l.await(l.underway); err != nil {
		return 0, err
	}
	return l.await(l.start(p))
}

func (l *serialLink) start(p []byte) chan wroteBytes {
	p = bytes.Clone(p) // the caller may use p again before the write has ended
	done := make(chan wroteBytes, 1)
	go func() {
		var w wroteBytes
		for w.n < len(p) && w.err == nil {
			var n int
			n, w.err = l.port.Write(p[w.n:])
			w.n += n
		}
		done <- w
	}()
	return done
}

func (l *serialLink) await(done chan wroteBytes) (int, error) {
	tick := time.NewTicker(slice)
	defer tick.Stop()
	for {
		select {
		case w := <-done:
			l.underway = nil
			if w.err != nil {
				return w.n, l.gone(w.err)
			}
			return w.n, nil
		case <-tick.C:
			if _, err := l.left(); err != nil {
				l.underway = done
				return 0, err
			}
		}
	}
}

// left is how long to wait before looking again.
func (l *serialLink) left() (time.Duration, error) {
	if l.closed.Load() {
		return 0, os.ErrClosed
	}
	d := l.deadline.Load()
	if d == nil || d.IsZero() {
		return slice, nil
	}
	left := time.Until(*d)
	if left <= 0 {
		return 0, os.ErrDeadlineExceeded
	}
	return min(left, slice), nil
}

// SetDeadline moves the end of every wait; one under way notices within 20 ms.
func (l *serialLink) SetDeadline(t time.Time) error {
	if l.closed.Load() {
		return os.ErrClosed
	}
	l.deadline.Store(&t)
	return nil
}

// Close ends the waits, closes the port and lets go of the lock. What was written is still sent, except
// where a write is stuck.
func (l *serialLink) Close() error {
	if l.closed.Swap(true) {
		return nil
	}
	l.reading.Lock() // both waits see closed within a slice, and the port is not closed under them
	defer l.reading.Unlock()
	l.writing.Lock()
	defer l.writing.Unlock()
	if l.underway != nil {
		_ = l.port.ResetOutputBuffer() // or closing waits for the far end too
	}
	return errors.Join(l.port.Close(), l.lock.Close())
}

// gone says what an error of an open port means.
func (l *serialLink) gone(err error) error {
	if l.closed.Load() {
		return os.ErrClosed
	}
	return fmt.Errorf("serial port %s is gone (%w): check that its adapter is still plugged in", l.device, err)
}
