//go:build unix

package simbench

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
	"syscall"
	"time"

	"github.com/creack/pty"
	"go.bug.st/serial"
)

// terminal is the instrument's end of a pseudo-terminal. The other end is held open too: were nobody at it,
// reads would fail until a client comes.
type terminal struct {
	*os.File          // the instrument's end
	client   *os.File // the end whose path clients open
}

func (t terminal) Close() error {
	err := t.File.Close()
	if e := t.client.Close(); err == nil {
		err = e
	}
	return err
}

// ServePTY lets the named instrument answer on a pseudo-terminal too, and gives the path that a client opens as its
// serial port. It lasts until the bench is closed, save for a Drop: then path is gone, as with an adapter that is
// unplugged, and comes back when the instrument takes connections again.
func (b *Bench) ServePTY(name string) (path string, err error) {
	in, ok := b.instruments[name]
	if !ok {
		return "", fmt.Errorf("serve %q on a pseudo-terminal: the instruments are %v", name, Names())
	}
	b.ending.Lock()
	defer b.ending.Unlock()
	if err := b.ctx.Err(); err != nil {
		return "", fmt.Errorf("serve the %s on a pseudo-terminal: the bench is closed: %w", name, err)
	}
	dir, err := os.MkdirTemp("", "ringbook-bench-")
	if err != nil {
		return "", fmt.Errorf("serve the %s on a pseudo-terminal: a folder for its path: %w", name, err)
	}
	path = filepath.Join(dir, name)
	t, err := plug(path)
	if err != nil {
		os.RemoveAll(dir)
		return "", fmt.Errorf("serve the %s on a pseudo-terminal: %w", name, err)
	}
	b.serves.Go(func() {
		defer os.RemoveAll(dir)
		for b.ctx.Err() == nil {
			_ = in.Serve(b.ctx, io.ReadWriteCloser(t))
			os.Remove(path)
			for again := false; !again; {
				select {
				case <-b.ctx.Done():
					return
				case <-time.After(20 * time.Millisecond):
				}
				if in.Refuses() {
					continue
				}
				if next, err := plug(path); err == nil {
					t, again = next, true
				}
			}
		}
		t.Close()
	})
	return path, nil
}

// plug makes a pseudo-terminal whose other end is found at path.
func plug(path string) (terminal, error) {
	t, err := openTerminal()
	if err != nil {
		return terminal{}, err
	}
	if err := os.Symlink(t.client.Name(), path); err != nil {
		t.Close()
		return terminal{}, err
	}
	return t, nil
}

// openTerminal makes a pseudo-terminal that passes bytes as they are.
func openTerminal() (terminal, error) {
	near, far, err := pty.Open()
	if err != nil {
		return terminal{}, err
	}
	defer near.Close()
	if err := makeRaw(far.Name()); err != nil {
		far.Close()
		return terminal{}, err
	}
	// pty leaves its end in blocking mode, where a write to a client that does not read would outlast Close.
	fd, err := syscall.Dup(int(near.Fd()))
	if err == nil {
		syscall.CloseOnExec(fd)
		err = syscall.SetNonblock(fd, true)
	}
	if err != nil {
		far.Close()
		return terminal{}, err
	}
	return terminal{File: os.NewFile(uintptr(fd), near.Name()), client: far}, nil
}

// makeRaw takes echo, line editing and the translation of line ends off a terminal. The settings belong to the
// terminal and outlast this use of it, so that a client which sets nothing finds a plain line.
func makeRaw(path string) error {
	port, err := serial.Open(path, &serial.Mode{})
	if err != nil {
		return err
	}
	return port.Close()
}
