package scpi_test

import (
	"bufio"
	"bytes"
	"context"
	"errors"
	"io"
	"net"
	"os"
	"runtime"
	"strconv"
	"strings"
	"testing"
	"time"

	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
)

// block writes data as a definite block.
func block(data string) string {
	n := strconv.Itoa(len(data))
	return "#" + strconv.Itoa(len(n)) + n + data
}

// A block whose count lies, is cut off, or has its end wrong.
func TestBlockFaults(t *testing.T) {
	ctx := context.Background()
	const timeout = 150 * time.Millisecond
	for name, c := range map[string]struct {
		pieces  []string // as they are written, with a pause between
		close   bool     // after the pieces
		noQueue bool
		want    string // in the error; "": none
		block   string
	}{
		"right":                       {pieces: []string{"#15a\nb\nc\n"}, block: "a\nb\nc"},
		"terminator missing":          {pieces: []string{"#15a\nb\nc"}, block: "a\nb\nc"},
		"terminator doubled":          {pieces: []string{"#15a\nb\nc\n\n"}, block: "a\nb\nc"},
		"terminator doubled, CR LF":   {pieces: []string{"#15a\nb\nc\r\n\r\n"}, block: "a\nb\nc"},
		"terminator late":             {pieces: []string{"#15a\nb\nc", "\n"}, block: "a\nb\nc"},
		"terminator late, no queue":   {pieces: []string{"#15a\nb\nc", "\n"}, noQueue: true, block: "a\nb\nc"},
		"line feeds only":             {pieces: []string{"#14\n\n\n\n\n"}, block: "\n\n\n\n"},
		"empty":                       {pieces: []string{"#10\n"}, block: ""},
		"indefinite":                  {pieces: []string{"#0abc\n"}, block: "abc"},
		"indefinite, its end late":    {pieces: []string{"#0ab", "c\n"}, block: "abc"},
		"indefinite with a line feed": {pieces: []string{"#0ab\nc\n"}, want: `reply "#0ab" to "READ?": more came at once after it: "c`},
		"indefinite with no end":      {pieces: []string{"#0abc"}, want: `half a reply to "READ?": "#0abc" and then silence: 3 bytes of it had come: i/o timeout after 150ms`},
		"count too large":             {pieces: []string{"#216abcdefgh\n"}, want: `half a reply to "READ?": "#216" and then silence: 9 of the 16 bytes that its count promises had come: i/o timeout after 150ms`},
		"count of nearly a gigabyte":  {pieces: []string{"#9999999999abc\n"}, want: "longer than allowed: a block of 999999999 bytes, the most is 16777216"},
		"cut off":                     {pieces: []string{"#216abcdefgh"}, close: true, want: `the link failed at "READ?": 8 of the 16 bytes that its count promises had come: unexpected EOF`},
		"cut off in its head":         {pieces: []string{"#21"}, close: true, want: `the link failed at "READ?": unexpected EOF`},
		"cut off before anything":     {close: true, want: `the instrument closed the link at "READ?"`},
		"count too small":             {pieces: []string{"#14abcdefgh\n"}, want: `reply "#14" to "READ?": after the 4 bytes that its count promises came more, "efgh\n": its count is too small`},
		"count too small, late":       {pieces: []string{"#14abcd", "efgh\n"}, want: `after the 4 bytes that its count promises came more, "efgh"`},
		"count too small, NULs":       {pieces: []string{"#14abcd\x00\x00\n"}, want: `came more, "\x00\x00\n"`},
		"count too small, NULs late":  {pieces: []string{"#14abcd", "\x00\x00\n"}, want: `came more, "\x00\x00\n"`},
		"count too small, blanks":     {pieces: []string{"#14abcd    \n"}, want: `came more, "    \n"`},
		"three line feeds":            {pieces: []string{"#14abcd\n\n\n"}, want: `came more, "\n\n\n"`},
		"too small and no queue":      {pieces: []string{"#14abcd", "7\n"}, noQueue: true, want: `came more, "7\n"`},
		"letter in the count":         {pieces: []string{"#2x6abc\n"}, want: `reply "#2x6abc" to "READ?": not a block: 'x' in its byte count`},
		"no block":                    {pieces: []string{"1.5\n"}, want: `reply "1.5" to "READ?": not a block`},
	} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			good := &acquiretest.Instrument{Identity: identity, Answers: map[string]string{"NEXT?": "2"}}
			conn := dial(t, scpi.Options{Timeout: timeout, NoErrorQueue: c.noQueue}, func(rw net.Conn, in *bufio.Scanner) {
				for in.Scan() {
					if in.Text() != "READ?" {
						io.WriteString(rw, good.Answer(in.Text()))
						continue
					}
					for i, piece := range c.pieces {
						if i > 0 {
							time.Sleep(30 * time.Millisecond)
						}
						io.WriteString(rw, piece)
					}
					if c.close {
						return
					}
				}
			})
			if _, err := conn.Identity(ctx); err != nil {
				t.Fatal(err)
			}
			b, err := conn.QueryBlock(ctx, "READ?")
			if c.want == "" {
				if err != nil || string(b) != c.block {
					t.Fatalf("%q, %v", b, err)
				}
			} else {
				if err == nil || !strings.Contains(err.Error(), c.want) {
					t.Fatalf("%q, %v; want an error with %s", b, err, c.want)
				}
				if _, err := conn.QueryNumber(ctx, "NEXT?"); !errors.Is(err, scpi.ErrOutOfStep) {
					t.Fatalf("the next query gave %v; want ErrOutOfStep", err)
				}
				if c.close {
					return
				}
				if err := conn.Resync(ctx); err != nil {
					t.Fatal(err)
				}
			}
			if v, err := conn.QueryNumber(ctx, "NEXT?"); err != nil || v != 2 {
				t.Errorf("the next query gave %g, %v; want its own 2", v, err)
			}
		})
	}
}

// A count that promises what does not come makes no room for it.
func TestLyingCountTakesNoMemory(t *testing.T) {
	conn := dial(t, scpi.Options{Timeout: 50 * time.Millisecond}, meter("#9999999999abc\n"))
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	err := conn.QueryBlockTo(context.Background(), func(body io.Reader, size int64) error {
		if size != 999999999 {
			t.Errorf("size %d", size)
		}
		_, err := io.Copy(io.Discard, body)
		return err
	}, "READ?")
	runtime.ReadMemStats(&after)
	var link *scpi.LinkError
	if !errors.As(err, &link) || !link.Timeout() {
		t.Errorf("%v", err)
	}
	if got := after.TotalAlloc - before.TotalAlloc; got > 1<<20 {
		t.Errorf("%d bytes allocated", got)
	}
}

// The timeout bounds each silence of a block, not the whole; a line must be whole within it.
func TestSlowBlockAndStalledOne(t *testing.T) {
	ctx := context.Background()
	const timeout = 300 * time.Millisecond
	slow := func(pieces int, stall time.Duration) func(net.Conn, *bufio.Scanner) {
		good := &acquiretest.Instrument{Identity: identity}
		return func(rw net.Conn, in *bufio.Scanner) {
			for in.Scan() {
				if in.Text() != "READ?" {
					io.WriteString(rw, good.Answer(in.Text()))
					continue
				}
				io.WriteString(rw, "#3100")
				for range pieces {
					time.Sleep(70 * time.Millisecond)
					io.WriteString(rw, "0123456789")
				}
				time.Sleep(stall)
				io.WriteString(rw, "\n")
			}
		}
	}
	for _, withDeadlines := range []bool{true, false} {
		near, far := pair(t)
		defer far.Close()
		go slow(10, 0)(far, bufio.NewScanner(far))
		var rwc io.ReadWriteCloser = near
		if !withDeadlines {
			rwc = struct{ io.ReadWriteCloser }{near}
		}
		conn, err := scpi.NewConn(rwc, scpi.Options{Timeout: timeout})
		if err != nil {
			t.Fatal(err)
		}
		defer conn.Close()
		begun := time.Now()
		b, err := conn.QueryBlock(ctx, "READ?")
		if took := time.Since(begun); err != nil || len(b) != 100 || took < 2*timeout {
			t.Errorf("deadlines %t: %d bytes in %s, %v; want 100 in more than twice the timeout", withDeadlines, len(b), took, err)
		}
		short, cancel := context.WithTimeout(ctx, timeout)
		defer cancel()
		if _, err := conn.QueryBlock(short, "READ?"); !errors.Is(err, context.DeadlineExceeded) {
			t.Errorf("deadlines %t: a context that ends in the middle: %v", withDeadlines, err)
		}
	}
	conn := dial(t, scpi.Options{Timeout: timeout}, slow(5, 2*time.Second))
	begun := time.Now()
	_, err := conn.QueryBlock(ctx, "READ?")
	if took := time.Since(begun); !errors.Is(err, os.ErrDeadlineExceeded) || !strings.Contains(err.Error(), "50 of the 100 bytes") || took > 1500*time.Millisecond {
		t.Errorf("stalled: %v after %s", err, took)
	}
	cancelled, cancel := context.WithCancel(ctx)
	time.AfterFunc(100*time.Millisecond, cancel)
	conn = dial(t, scpi.Options{Timeout: timeout}, slow(10, 0))
	begun = time.Now()
	_, err = conn.QueryBlock(cancelled, "READ?")
	if took := time.Since(begun); !errors.Is(err, context.Canceled) || took > 600*time.Millisecond {
		t.Errorf("cancelled: %v after %s", err, took)
	}
	// The context ends while nothing is being read: the next read must not wait again.
	cancelled, cancel = context.WithCancel(ctx)
	conn = dial(t, scpi.Options{Timeout: 10 * time.Second}, slow(1, 2*time.Second))
	err = conn.QueryBlockTo(cancelled, func(body io.Reader, _ int64) error {
		io.ReadFull(body, make([]byte, 10))
		cancel()
		time.Sleep(20 * time.Millisecond)
		begun = time.Now()
		_, err := io.Copy(io.Discard, body)
		return err
	}, "READ?")
	if took := time.Since(begun); !errors.Is(err, context.Canceled) || took > 600*time.Millisecond {
		t.Errorf("cancelled between two reads: %v after %s", err, took)
	}
	line := dial(t, scpi.Options{Timeout: timeout}, func(rw net.Conn, in *bufio.Scanner) {
		in.Scan()
		for range 10 {
			time.Sleep(70 * time.Millisecond)
			io.WriteString(rw, "1")
		}
	})
	if _, err := line.QueryNumber(ctx, "READ?"); !errors.Is(err, os.ErrDeadlineExceeded) {
		t.Errorf("a line in drops: %v", err)
	}
}

// What take does not read is thrown away; what it says is wrong, is.
func TestTakeOfAStream(t *testing.T) {
	ctx := context.Background()
	long := strings.Repeat("\n0\x00", 100_000)
	conn := dial(t, scpi.Options{}, meter(block(long)+"\n"))
	for range 2 {
		first := make([]byte, 10)
		err := conn.QueryBlockTo(ctx, func(body io.Reader, size int64) error {
			_, err := io.ReadFull(body, first)
			return err
		}, "READ?")
		if err != nil || string(first) != long[:10] {
			t.Fatalf("%q, %v", first, err)
		}
	}
	var all bytes.Buffer
	if err := conn.QueryBlockTo(ctx, func(body io.Reader, _ int64) error { _, err := all.ReadFrom(body); return err }, "READ?"); err != nil || all.String() != long {
		t.Errorf("%d bytes, %v", all.Len(), err)
	}
	room := make([]byte, 4, len(long))
	if b, err := conn.QueryBlockInto(ctx, room, "READ?"); err != nil || string(b) != long || &b[0] != &room[0] {
		t.Errorf("into memory that is there: %d bytes, %v", len(b), err)
	}
	if b, err := conn.QueryBlockInto(ctx, room[:4:4], "READ?"); err != nil || string(b) != long || string(room[:4]) != long[:4] {
		t.Errorf("into too little memory: %d bytes, %v", len(b), err)
	}
	wrong := errors.New("not what was wanted")
	err := conn.QueryBlockTo(ctx, func(io.Reader, int64) error { return wrong }, "READ?")
	var nonsense *scpi.ReplyError
	if !errors.As(err, &nonsense) || !errors.Is(err, wrong) || nonsense.Reply != "#6300000" {
		t.Errorf("%v", err)
	}
	if conn.OutOfStep() == nil {
		t.Error("in step after a reply that was refused")
	}
	if err := conn.Resync(ctx); err != nil {
		t.Error(err)
	}
	for reply, want := range map[string]string{"1,2,3\n": "1,2,3", "#151,2,3\n": "1,2,3", "#01,2,3\r\n": "1,2,3\r", " 1,2,3\r\n": "1,2,3"} {
		conn := dial(t, scpi.Options{}, meter(reply))
		for range 2 {
			var got []byte
			err := conn.QueryTextTo(ctx, func(body io.Reader, _ int64) (err error) { got, err = io.ReadAll(body); return err }, "READ?")
			if err != nil || string(got) != want {
				t.Errorf("%q: %q, %v", reply, got, err)
			}
		}
	}
	half := dial(t, scpi.Options{Timeout: 50 * time.Millisecond}, meter("1,2,3"))
	err = half.QueryTextTo(ctx, func(body io.Reader, _ int64) error { _, err := io.Copy(io.Discard, body); return err }, "READ?")
	if err == nil || !strings.Contains(err.Error(), `half a reply to "READ?": "1,2,3" and then silence`) {
		t.Errorf("%v", err)
	}
	mute := dial(t, scpi.Options{Timeout: 50 * time.Millisecond}, meter(""))
	var refused *scpi.InstrumentError
	if _, err := mute.QueryBlock(ctx, "WRONG?"); !errors.As(err, &refused) || refused.Number != -113 {
		t.Errorf("a query it does not know: %v", err)
	}
}
