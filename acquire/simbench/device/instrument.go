package device

import (
	"errors"
	"fmt"
	"strings"
	"sync"
)

// Command is one header an instrument knows and what it does.
type Command struct {
	Header   string // as the standard writes it: "MEASure:VOLTage[:DC]?"
	Min, Max int    // how many arguments it takes
	// Do runs it. A query returns its reply, without terminator; a command's reply is not sent. An
	// error that is no *Error is queued as -300.
	Do func(args []Arg) (reply string, err error)
}

// Instrument answers program messages. It is safe for concurrent use: one message runs at a time.
type Instrument struct {
	identity string
	reset    func()
	commands []Command
	headers  []header

	troubles troubles

	mu      sync.Mutex
	status  status
	waiting bool // a reply to an earlier query of the message stands in the output queue
}

// New makes an instrument. identity is the reply to *IDN?, four fields with commas between; reset does
// what *RST means to it and may be nil. It fails on a header in a notation it cannot read.
func New(identity string, reset func(), commands []Command) (*Instrument, error) {
	in := &Instrument{identity: identity, reset: reset, status: powerOn()}
	if strings.Count(identity, ",") != 3 || strings.ContainsAny(identity, ";\r\n") {
		return nil, fmt.Errorf("instrument %q: an identity has four fields with commas between", identity)
	}
	in.commands = append(in.common(), commands...)
	for _, c := range in.commands {
		h, err := compile(c.Header)
		if err != nil {
			return nil, fmt.Errorf("instrument %q: %w", identity, err)
		}
		in.headers = append(in.headers, h)
	}
	return in, nil
}

// Execute runs one program message, given without its terminator, and returns the replies of its
// queries with a line feed behind; nil when there is nothing to reply. What goes wrong is queued, and
// ends the message.
func (in *Instrument) Execute(message []byte) []byte {
	in.mu.Lock()
	defer in.mu.Unlock()
	var (
		s    = scanner{rest: message}
		path []string
		out  []byte
		sent int
	)
	in.waiting = false
	for {
		u, ok, err := s.parse()
		if err == nil && !ok {
			break
		}
		var reply string
		if err == nil {
			reply, err = in.run(u, &path)
		}
		if err != nil {
			in.raise(err)
			break
		}
		if u.query {
			if sent > 0 {
				out = append(out, ';')
			}
			out = append(out, reply...)
			sent++
			in.waiting = true
		}
	}
	if sent == 0 {
		return nil
	}
	return append(out, '\n')
}

// overrun notes a message longer than the input buffer.
func (in *Instrument) overrun() {
	in.mu.Lock()
	defer in.mu.Unlock()
	in.raise(Errorf(-363, "a message may have %d bytes", longestMessage))
}

func (in *Instrument) raise(err error) {
	var e *Error
	if !errors.As(err, &e) {
		e = Errorf(-300, "%v", err)
	}
	in.status.raise(e)
}

// run finds the unit's command and runs it. path is the current path: the nodes above the last header,
// from which a header without a colon goes on (SCPI-1999 volume 1, 6.2.4).
func (in *Instrument) run(u unit, path *[]string) (string, error) {
	nodes := u.nodes
	if !u.common() {
		if !u.root {
			nodes = append(append([]string(nil), *path...), u.nodes...)
		}
		*path = nodes[:len(nodes)-1]
	}
	name := strings.Join(nodes, ":")
	for i, h := range in.headers {
		if h.query != u.query {
			continue
		}
		ok, bad := h.match(nodes)
		if !ok {
			continue
		}
		c := in.commands[i]
		switch {
		case bad:
			return "", Errorf(-114, "%s", name)
		case len(u.args) < c.Min:
			return "", Errorf(-109, "%s", name)
		case len(u.args) > c.Max:
			return "", Errorf(-108, "%s", name)
		}
		return c.Do(u.args)
	}
	return "", Errorf(-113, "%s", name)
}
