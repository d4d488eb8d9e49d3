package acquiretest

import (
	"errors"
	"fmt"
	"io"
	"os"
	"sync"
	"time"

	"ringbook/acquire/wire"
)

// Recorder is a link that writes down what passes.
type Recorder struct {
	link wire.Link
	mu   sync.Mutex
	w    io.Writer
	err  error // the first failure of w
}

// Record wraps a link and writes the dialogue over it to w as it passes.
func Record(link wire.Link, w io.Writer) *Recorder { return &Recorder{link: link, w: w} }

func (r *Recorder) note(e event) {
	r.mu.Lock()
	defer r.mu.Unlock()
	if _, err := fmt.Fprintln(r.w, e); err != nil && r.err == nil {
		r.err = err
	}
}

// Read reads from the link.
func (r *Recorder) Read(p []byte) (int, error) {
	n, err := r.link.Read(p)
	switch {
	case n > 0:
		r.note(event{kind: '<', data: string(p[:n])})
	case errors.Is(err, os.ErrDeadlineExceeded):
		r.note(event{kind: '!', data: "timeout"})
	case err != nil:
		r.note(event{kind: '!', data: "closed"})
	}
	return n, err
}

// Write writes to the link.
func (r *Recorder) Write(p []byte) (int, error) {
	n, err := r.link.Write(p)
	if n > 0 {
		r.note(event{kind: '>', data: string(p[:n])})
	}
	return n, err
}

// SetDeadline sets the link's.
func (r *Recorder) SetDeadline(t time.Time) error { return r.link.SetDeadline(t) }

// Close closes the link, and says whether the dialogue could not be written down.
func (r *Recorder) Close() error {
	err := r.link.Close()
	r.mu.Lock()
	defer r.mu.Unlock()
	if r.err != nil {
		return fmt.Errorf("write down the dialogue: %w", r.err)
	}
	return err
}
