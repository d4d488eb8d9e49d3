package acquiretest

import (
	"fmt"
	"io"
	"os"
	"strconv"
	"strings"
	"sync"
	"time"
)

// TB is what Playback and Serve need of a *testing.T.
type TB interface {
	Helper()
	Errorf(format string, args ...any)
	Cleanup(func())
}

// Player is a link that plays a dialogue back.
type Player struct {
	t      TB
	mu     sync.Mutex
	events []event
	closed bool
	failed bool
}

// Playback gives a link on which the instrument's part of a dialogue is played. What the client sends
// that the dialogue has not, what it reads that nobody sent, and what is left over at the end of the
// test, are failures of the test. A client may cut what it sends into other pieces than the recorded one.
func Playback(t TB, r io.Reader) *Player {
	t.Helper()
	events, err := read(r)
	if err != nil {
		t.Errorf("%v", err)
	}
	p := &Player{t: t, events: events, failed: err != nil}
	t.Cleanup(func() {
		p.mu.Lock()
		defer p.mu.Unlock()
		if len(p.events) > 0 && !p.failed {
			t.Errorf("dialogue left unused from line %d: %s (%d in all)", p.events[0].line, p.events[0], len(p.events))
		}
	})
	return p
}

// fail makes the test fail once: what follows the first difference is noise.
func (p *Player) fail(format string, args ...any) error {
	err := fmt.Errorf("playback: "+format, args...)
	if !p.failed {
		p.t.Helper()
		p.t.Errorf("%v", err)
	}
	p.failed = true
	return err
}

// Read gives the next bytes the instrument sent.
func (p *Player) Read(b []byte) (int, error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	switch {
	case p.closed:
		return 0, os.ErrClosed
	case p.failed:
		return 0, io.ErrUnexpectedEOF
	case len(b) == 0:
		return 0, nil
	case len(p.events) == 0:
		return 0, p.fail("a read after the dialogue's end")
	}
	e := &p.events[0]
	switch {
	case e.kind == '>':
		return 0, p.fail("a read where line %d of the dialogue has %s", e.line, e)
	case e.kind == '!' && e.data == "timeout":
		p.events = p.events[1:]
		return 0, os.ErrDeadlineExceeded
	case e.kind == '!':
		p.events = p.events[1:]
		return 0, io.EOF
	}
	n := copy(b, e.data)
	if e.data = e.data[n:]; e.data == "" {
		p.events = p.events[1:]
	}
	return n, nil
}

// Write takes the next bytes the client sends.
func (p *Player) Write(b []byte) (int, error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.closed {
		return 0, os.ErrClosed
	}
	for sent := string(b); sent != ""; {
		if p.failed {
			return 0, io.ErrUnexpectedEOF
		}
		if len(p.events) == 0 {
			return 0, p.fail("%s sent after the dialogue's end", strconv.QuoteToASCII(sent))
		}
		e := &p.events[0]
		n := min(len(sent), len(e.data))
		if e.kind != '>' || !strings.HasPrefix(e.data, sent[:n]) {
			return 0, p.fail("%s sent where line %d of the dialogue has %s", strconv.QuoteToASCII(sent), e.line, e)
		}
		sent = sent[n:]
		if e.data = e.data[n:]; e.data == "" {
			p.events = p.events[1:]
		}
	}
	return len(b), nil
}

// SetDeadline does nothing: playback never waits.
func (p *Player) SetDeadline(time.Time) error { return nil }

// Close ends the link; what is left of the dialogue is reported when the test ends.
func (p *Player) Close() error {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.closed = true
	return nil
}
