package device

import (
	"bufio"
	"context"
	"io"
	"net"
	"os"
	"strings"
	"testing"
	"time"
)

// patient gives a served meter and a dial to it.
func patient(t *testing.T) (*Instrument, func() *client) {
	t.Helper()
	in := meter(t)
	in.commands = append(in.commands, Command{Header: "SAMPles?", Do: func([]Arg) (string, error) { return Block([]byte("0123456789")), nil }})
	h, err := compile("SAMPles?")
	if err != nil {
		t.Fatal(err)
	}
	in.headers = append(in.headers, h)
	ctx, cancel := context.WithCancel(t.Context())
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	done := make(chan error, 1)
	go func() { done <- in.ServeListener(ctx, ln) }()
	t.Cleanup(func() { cancel(); <-done })
	return in, func() *client {
		conn, err := net.Dial("tcp", ln.Addr().String())
		if err != nil {
			t.Fatal(err)
		}
		t.Cleanup(func() { conn.Close() })
		return &client{t, conn, bufio.NewReader(conn)}
	}
}

type client struct {
	t    *testing.T
	conn net.Conn
	r    *bufio.Reader
}

// ask sends messages, each of which ends a line, and reads one line back.
func (c *client) ask(messages ...string) string {
	c.t.Helper()
	c.conn.SetDeadline(time.Now().Add(10 * time.Second))
	for _, m := range messages {
		if _, err := io.WriteString(c.conn, m+"\n"); err != nil {
			c.t.Fatal(err)
		}
	}
	line, err := c.r.ReadString('\n')
	if err != nil {
		c.t.Fatalf("%q: %q, %v", messages, line, err)
	}
	return strings.TrimSuffix(line, "\n")
}

// nothing sends a message and gives what comes within a short time that has no line end.
func (c *client) nothing(message string) (got string, err error) {
	c.t.Helper()
	io.WriteString(c.conn, message+"\n")
	c.conn.SetDeadline(time.Now().Add(100 * time.Millisecond))
	return c.r.ReadString('\n')
}

func cause(t *testing.T, in *Instrument, list ...Trouble) {
	t.Helper()
	for _, x := range list {
		if err := in.Trouble(x); err != nil {
			t.Fatal(err)
		}
	}
}

// TestTroubleWithReplies: each befalls the reply it should, and the one after is well again.
func TestTroubleWithReplies(t *testing.T) {
	in, dial := patient(t)
	c := dial()
	well := func(after string) {
		t.Helper()
		if got := c.ask("MEAS:VOLT?"); got != "1.5" {
			t.Errorf("after %s: %q", after, got)
		}
	}
	cause(t, in, Trouble{Kind: Garbage, After: 3})
	well("nothing")
	c.ask("VOLT 3", "MEAS:FREQ?") // a command has no reply to count
	if got := c.ask("MEAS:VOLT?"); got == "1.5" {
		t.Errorf("garbage did not come")
	}
	if got := c.ask(); !strings.HasPrefix(got, "\x07") { // what it holds after the line end inside
		t.Errorf("garbage goes on %q", got)
	}
	well("garbage")
	cause(t, in, Trouble{Kind: Cut})
	if got, err := c.nothing("MEAS:VOLT?"); got != "1." || !os.IsTimeout(err) {
		t.Errorf("cut: %q, %v", got, err)
	}
	well("a cut")
	cause(t, in, Trouble{Kind: CutBlock})
	well("no block")
	if got, err := c.nothing("SAMP?"); got != "#210012" || !os.IsTimeout(err) {
		t.Errorf("cut block: %q, %v", got, err)
	}
	well("a cut block")
	cause(t, in, Trouble{Kind: Stale})
	if got, err := c.nothing("MEAS:FREQ?"); got != "" || !os.IsTimeout(err) {
		t.Errorf("held back: %q, %v", got, err)
	}
	if got := c.ask("MEAS:VOLT?") + " " + c.ask(); got != "2.5 1.5" {
		t.Errorf("then came %q", got)
	}
	well("a stale reply")
	cause(t, in, Trouble{Kind: Line, Text: "HELLO"})
	if got := c.ask(); got != "HELLO" {
		t.Errorf("unasked came %q", got)
	}
	cause(t, in, Trouble{Kind: Line, Text: "AHEAD", After: 2})
	well("a line")
	if got := c.ask("MEAS:FREQ?") + " " + c.ask(); got != "AHEAD 2.5" {
		t.Errorf("a line ahead: %q", got)
	}
	cause(t, in, Trouble{Kind: Delay, For: 150 * time.Millisecond})
	start := time.Now()
	if well("a line"); time.Since(start) < 150*time.Millisecond {
		t.Error("the reply was not late")
	}
	cause(t, in, Trouble{Kind: Entry, Code: -240, Text: "fan"})
	if got := c.ask("SYST:ERR?"); got != `-240,"Hardware error;fan"` {
		t.Errorf("entry %q", got)
	}
	cause(t, in, Trouble{Kind: Entry, Code: -240}, Trouble{Kind: Cut, After: 2}, Trouble{Kind: Garbage, After: 2, Text: "#"})
	c.ask("SYST:ERR?")
	if got := c.ask("MEAS:VOLT?"); got != "#" { // the later of two has the last word
		t.Errorf("two at once: %q", got)
	}
	if happened, waiting := in.Troubles(); happened != 11 || waiting != 0 {
		t.Errorf("%d happened, %d wait", happened, waiting)
	}
}

// TestTroubleWithLinks: connections that end now, at a message, and are refused; silence; and forgetting.
func TestTroubleWithLinks(t *testing.T) {
	in, dial := patient(t)
	ended := func(c *client) {
		t.Helper()
		c.conn.SetDeadline(time.Now().Add(10 * time.Second))
		if got, err := c.r.ReadString('\n'); err == nil || os.IsTimeout(err) {
			t.Errorf("the connection goes on: %q, %v", got, err)
		}
	}
	a, b := dial(), dial()
	a.ask("*IDN?")
	b.ask("*IDN?")
	cause(t, in, Trouble{Kind: Drop})
	ended(a)
	ended(b)

	a = dial()
	cause(t, in, Trouble{Kind: Drop, After: 3, For: 200 * time.Millisecond})
	start := time.Now()
	a.ask("VOLT 4", "VOLT?")
	io.WriteString(a.conn, "VOLT 5\nVOLT 6\n") // sent at once: neither is run
	ended(a)
	b = dial()
	ended(b)
	if !in.Refuses() && time.Since(start) < 200*time.Millisecond {
		t.Error("it takes connections")
	}
	for in.Refuses() {
		time.Sleep(10 * time.Millisecond)
	}
	a = dial()
	if got := a.ask("VOLT?"); got != "4.000E+00" {
		t.Errorf("the message that dropped the link was run: %q", got)
	}

	cause(t, in, Trouble{Kind: Silence, After: 2, For: time.Hour})
	a.ask("VOLT?")
	if got, err := a.nothing("VOLT 7"); got != "" || !os.IsTimeout(err) {
		t.Errorf("silent: %q, %v", got, err)
	}
	if got, err := a.nothing("VOLT?"); got != "" || !os.IsTimeout(err) {
		t.Errorf("still silent: %q, %v", got, err)
	}
	cause(t, in, Trouble{Kind: Cut, After: 1})
	in.ClearTroubles()
	if got := a.ask("VOLT?"); got != "4.000E+00" {
		t.Errorf("after silence: %q", got)
	}
	if happened, waiting := in.Troubles(); happened != 3 || waiting != 0 {
		t.Errorf("%d happened, %d wait", happened, waiting)
	}
}

func TestTroubleRefused(t *testing.T) {
	in := meter(t)
	for _, x := range []Trouble{
		{}, {Kind: "flood"}, {Kind: Cut, After: -1}, {Kind: Silence}, {Kind: Delay, For: -1}, {Kind: Delay, For: 2 * time.Hour}, {Kind: Entry},
	} {
		if err := in.Trouble(x); err == nil {
			t.Errorf("%+v is taken", x)
		}
	}
	for range mostTroubles {
		cause(t, in, Trouble{Kind: Cut})
	}
	if err := in.Trouble(Trouble{Kind: Cut}); err == nil {
		t.Error("there is no end to them")
	}
}

// TestLateReplyEndsWithTheServer: a delay does not outlast the server.
func TestLateReplyEndsWithTheServer(t *testing.T) {
	in := meter(t)
	near, far := net.Pipe()
	defer near.Close()
	ctx, cancel := context.WithCancel(t.Context())
	done := make(chan error, 1)
	go func() { done <- in.Serve(ctx, far) }()
	cause(t, in, Trouble{Kind: Delay, For: time.Hour})
	io.WriteString(near, "*IDN?\n")
	time.Sleep(20 * time.Millisecond)
	cancel()
	if err := <-done; err != context.Canceled {
		t.Errorf("it ended with %v", err)
	}
}
