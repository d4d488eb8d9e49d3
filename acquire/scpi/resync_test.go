package scpi_test

import (
	"bufio"
	"context"
	"errors"
	"net"
	"strings"
	"testing"
	"time"

	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
)

// lagging answers the first SLOW? only after a while, and everything in order.
func lagging(late string, lag time.Duration) func(net.Conn, *bufio.Scanner) {
	good := &acquiretest.Instrument{Identity: identity, Answers: map[string]string{"READ?": "2"}}
	return answering(func(m string) string {
		if m == "SLOW?" {
			time.Sleep(lag)
			return late
		}
		return good.Answer(m)
	})
}

// The reply to a query that was given up must never be taken for the next one's.
func TestLateReplyIsNotTaken(t *testing.T) {
	ctx := context.Background()
	for name, late := range map[string]string{
		"number": "1\n", "two lines": "1\n1\n", "block with no end": "#15a\nb\nc", "binary": "\xff\xfe\n\x00\x80", "identity look-alike": "a,b,c,d\n",
	} {
		t.Run(name, func(t *testing.T) {
			conn := dial(t, scpi.Options{Timeout: 250 * time.Millisecond, NoErrorQueue: name == "block with no end"}, lagging(late, 300*time.Millisecond))
			if _, err := conn.Identity(ctx); err != nil {
				t.Fatal(err)
			}
			short, cancel := context.WithTimeout(ctx, 10*time.Millisecond)
			defer cancel()
			if _, err := conn.QueryNumber(short, "SLOW?"); !errors.Is(err, context.DeadlineExceeded) {
				t.Fatal(err)
			}
			if _, err := conn.QueryNumber(ctx, "READ?"); !errors.Is(err, scpi.ErrOutOfStep) {
				t.Fatalf("the next query gave %v; want ErrOutOfStep", err)
			}
			if err := conn.Resync(ctx); err != nil {
				t.Fatal(err)
			}
			if v, err := conn.QueryNumber(ctx, "READ?"); err != nil || v != 2 {
				t.Errorf("after Resync: %g, %v; want 2", v, err)
			}
		})
	}
}

// An unsolicited line makes every reply come one question late. The error queue's form shows it.
func TestUnsolicitedLine(t *testing.T) {
	ctx := context.Background()
	good := &acquiretest.Instrument{Identity: identity, Answers: map[string]string{"READ?": "2"}}
	conn := dial(t, scpi.Options{Timeout: time.Second}, func(rw net.Conn, in *bufio.Scanner) {
		rw.Write([]byte("1\n"))
		acquiretest.Talk(rw, good.Answer)
	})
	v, err := conn.QueryNumber(ctx, "READ?")
	var nonsense *scpi.ReplyError
	if !errors.As(err, &nonsense) {
		t.Fatalf("%g, %v; want a *ReplyError", v, err)
	}
	if err := conn.Resync(ctx); err != nil {
		t.Fatal(err)
	}
	if v, err := conn.QueryNumber(ctx, "READ?"); err != nil || v != 2 {
		t.Errorf("after Resync: %g, %v; want 2", v, err)
	}
}

func TestResyncRefusals(t *testing.T) {
	ctx := context.Background()
	for name, c := range map[string]struct {
		answer func(m string) string
		want   string
	}{
		"another instrument": {func(m string) string { return "Other Works,Supply,1,1\n" }, "not \"" + identity},
		"silent":             {func(m string) string { return "" }, "no reply"},
		"not an instrument":  {func(m string) string { return strings.Repeat("login:\n", 70) }, "not \"" + identity},
	} {
		t.Run(name, func(t *testing.T) {
			first := true
			good := &acquiretest.Instrument{Identity: identity}
			conn := dial(t, scpi.Options{Timeout: 200 * time.Millisecond}, func(rw net.Conn, in *bufio.Scanner) {
				acquiretest.Talk(rw, func(m string) string {
					if m == "BREAK?" {
						first = false
						return "oops\n"
					}
					if first {
						return good.Answer(m)
					}
					if name == "another instrument" {
						return strings.Repeat(c.answer(m), 64)
					}
					return c.answer(m)
				})
			})
			if _, err := conn.Identity(ctx); err != nil {
				t.Fatal(err)
			}
			conn.QueryNumber(ctx, "BREAK?")
			if err := conn.Resync(ctx); err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("Resync gave %v; want %s", err, c.want)
			}
			if conn.OutOfStep() == nil {
				t.Error("in step after a failed Resync")
			}
		})
	}
}

func TestResyncBabble(t *testing.T) {
	conn := dial(t, scpi.Options{Timeout: 200 * time.Millisecond}, func(rw net.Conn, in *bufio.Scanner) {
		for {
			if _, err := rw.Write([]byte("1.0\n")); err != nil {
				return
			}
		}
	})
	if err := conn.Resync(context.Background()); err == nil {
		t.Error("a link that babbles was cleared")
	}
}
