package scpi_test

import (
	"bufio"
	"context"
	"errors"
	"io"
	"net"
	"os"
	"strings"
	"testing"
	"time"

	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
)

const identity = "Example Works,Meter 7,0042,1.3"

// pair gives the two ends of a TCP connection over loopback. (A net.Pipe holds no byte: what an
// instrument sends too much would block it.)
func pair(t *testing.T) (near, far net.Conn) {
	t.Helper()
	listener, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer listener.Close()
	if near, err = net.Dial("tcp", listener.Addr().String()); err != nil {
		t.Fatal(err)
	}
	if far, err = listener.Accept(); err != nil {
		t.Fatal(err)
	}
	return near, far
}

// dial starts an instrument that runs peer on its end of a connection, and a Conn on the other.
func dial(t *testing.T, opt scpi.Options, peer func(rw net.Conn, in *bufio.Scanner)) *scpi.Conn {
	t.Helper()
	near, far := pair(t)
	done := make(chan struct{})
	go func() {
		defer close(done)
		defer far.Close()
		peer(far, bufio.NewScanner(far))
	}()
	if opt.Timeout == 0 {
		opt.Timeout = 5 * time.Second
	}
	conn, err := scpi.NewConn(near, opt)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { conn.Close(); <-done })
	return conn
}

// answering makes a peer of a function from message to reply.
func answering(answer func(string) string) func(net.Conn, *bufio.Scanner) {
	return func(rw net.Conn, _ *bufio.Scanner) { acquiretest.Talk(rw, answer) }
}

// meter answers READ? with the reply given, line end included, and is otherwise well behaved.
func meter(reply string) func(net.Conn, *bufio.Scanner) {
	good := &acquiretest.Instrument{Identity: identity, Commands: map[string]string{
		"VOLT 9.9E+01": `-222,"Data out of range;VOLT"`, "VOLT 5.0E+00": "",
	}}
	return answering(func(m string) string {
		if m == "READ?" {
			return reply
		}
		return good.Answer(m)
	})
}

func TestRepliesAndTheirEnds(t *testing.T) {
	ctx := context.Background()
	for name, reply := range map[string]string{
		"LF": "1.5E+3\n", "CR LF": "1.5E+3\r\n", "CR": "1.5E+3\r", "LF CR": "1.5E+3\n\r",
		"space before": "  1.5E+3\n", "space behind": "1.5E+3 \t\n", "line end before": "\r\n1.5E+3\n", "NUL before": "\x001.5E+3\n",
	} {
		conn := dial(t, scpi.Options{}, meter(reply))
		for range 3 { // what is left of one reply must not spoil the next
			if v, err := conn.QueryNumber(ctx, "READ?"); err != nil || v != 1500 {
				t.Errorf("%s: %g, %v", name, v, err)
			}
		}
	}
}

func TestKindsOfReply(t *testing.T) {
	ctx := context.Background()
	if s, err := dial(t, scpi.Options{}, meter("\"a\"\"b\"\n")).QueryString(ctx, "READ?"); err != nil || s != `a"b` {
		t.Errorf("string %q, %v", s, err)
	}
	if s, err := dial(t, scpi.Options{}, meter(" CHAN1,ON \r\n")).QueryLine(ctx, "READ?"); err != nil || s != "CHAN1,ON" {
		t.Errorf("line %q, %v", s, err)
	}
	if s, err := dial(t, scpi.Options{}, meter("")).Identity(ctx); err != nil || s != identity {
		t.Errorf("identity %q, %v", s, err)
	}
	for reply, want := range map[string]string{
		"#15a\nb\nc\n": "a\nb\nc", "#15a\nb\nc": "a\nb\nc", "#15a\nb\nc\r\n": "a\nb\nc", "\n#203\r\n\x00\n": "\r\n\x00", "#0abc\n": "abc", "#10\n": "",
	} {
		conn := dial(t, scpi.Options{}, meter(reply))
		for range 3 {
			if b, err := conn.QueryBlock(ctx, "READ?"); err != nil || string(b) != want {
				t.Errorf("block %q: %q, %v", reply, b, err)
			}
		}
	}
}

// Each write of the peer is one byte, with a pause in the middle longer than any one read need take.
func TestOneByteAtATime(t *testing.T) {
	good := &acquiretest.Instrument{Identity: identity, Answers: map[string]string{"READ?": "+1.5E+03", "CURVe?": "#214" + "0123\n56789abcd"}}
	conn := dial(t, scpi.Options{}, answering(good.Answer))
	slow := dial(t, scpi.Options{}, func(rw net.Conn, in *bufio.Scanner) {
		for in.Scan() {
			reply := good.Answer(in.Text())
			for i := range len(reply) {
				if i == len(reply)/2 {
					time.Sleep(30 * time.Millisecond)
				}
				rw.Write([]byte(reply[i : i+1]))
			}
		}
	})
	for _, c := range []*scpi.Conn{conn, slow} {
		if v, err := c.QueryNumber(context.Background(), "READ?"); err != nil || v != 1500 {
			t.Errorf("%g, %v", v, err)
		}
		if b, err := c.QueryBlock(context.Background(), "CURVe?"); err != nil || string(b) != "0123\n56789abcd" {
			t.Errorf("%q, %v", b, err)
		}
	}
}

func TestNoReading(t *testing.T) {
	conn := dial(t, scpi.Options{}, meter("+9.91000000E+37\n"))
	for range 2 {
		v, err := conn.QueryNumber(context.Background(), "READ?")
		if !errors.Is(err, scpi.ErrNoReading) || v == v {
			t.Errorf("%g, %v; want NaN, ErrNoReading", v, err)
		}
	}
	if conn.OutOfStep() != nil {
		t.Error("no reading is a proper reply: the Conn must stay in step")
	}
}

func TestInstrumentError(t *testing.T) {
	ctx := context.Background()
	conn := dial(t, scpi.Options{}, meter("1\n"))
	var refused *scpi.InstrumentError
	err := conn.Command(ctx, "VOLT", scpi.Number(99))
	if !errors.As(err, &refused) || refused.Number != -222 || refused.Text != "Data out of range;VOLT" || refused.Command != "VOLT 9.9E+01" {
		t.Errorf("%v", err)
	}
	if err := conn.Command(ctx, "VOLT", scpi.Number(5)); err != nil {
		t.Errorf("the queue was not emptied: %v", err)
	}
}

func TestQueueWithSeveralEntries(t *testing.T) {
	queue := []string{`-102,"Syntax error"`, `-222,"Data out of range"`, `-350,"Queue overflow"`, `+0,"No error"`}
	asked := 0
	conn := dial(t, scpi.Options{}, answering(func(m string) string {
		if m != "SYSTem:ERRor?" {
			return ""
		}
		asked++
		return queue[asked-1] + "\n"
	}))
	var refused *scpi.InstrumentError
	err := conn.Command(context.Background(), "X")
	if !errors.As(err, &refused) || len(refused.Then) != 2 || refused.Endless || asked != 4 || !strings.Contains(err.Error(), "queue overflowed") {
		t.Errorf("after %d reads: %v", asked, err)
	}
}

func TestQueueNeverEmpty(t *testing.T) {
	asked := 0
	conn := dial(t, scpi.Options{MaxErrors: 7}, answering(func(m string) string {
		if m != "SYSTem:ERRor?" {
			return ""
		}
		asked++
		return "-240,\"Hardware error\"\n"
	}))
	var refused *scpi.InstrumentError
	if err := conn.Command(context.Background(), "X"); !errors.As(err, &refused) || !refused.Endless || asked != 7 {
		t.Errorf("after %d reads: %v", asked, err)
	}
}

// A query the instrument does not know brings no reply, and the queue tells why.
func TestSilenceExplained(t *testing.T) {
	ctx := context.Background()
	conn := dial(t, scpi.Options{Timeout: 50 * time.Millisecond}, meter("5\n"))
	var refused *scpi.InstrumentError
	if _, err := conn.QueryNumber(ctx, "WRONG?"); !errors.As(err, &refused) || refused.Number != -113 || refused.Command != "WRONG?" {
		t.Errorf("%v", err)
	}
	if v, err := conn.QueryNumber(ctx, "READ?"); err != nil || v != 5 {
		t.Errorf("the next query: %g, %v", v, err)
	}
}

func TestNonsense(t *testing.T) {
	ctx := context.Background()
	number := func(c *scpi.Conn) error { _, err := c.QueryNumber(ctx, "READ?"); return err }
	text := func(c *scpi.Conn) error { _, err := c.QueryString(ctx, "READ?"); return err }
	block := func(c *scpi.Conn) error { _, err := c.QueryBlock(ctx, "READ?"); return err }
	id := func(c *scpi.Conn) error { _, err := c.Identity(ctx); return err }
	for name, c := range map[string]struct {
		peer func(net.Conn, *bufio.Scanner)
		ask  func(*scpi.Conn) error
		want string
	}{
		"word for a number":     {meter("HELLO\n"), number, `reply "HELLO" to "READ?": not a number`},
		"two numbers":           {meter("1,2\n"), number, `"1,2"`},
		"number for a string":   {meter("12\n"), text, "not a string"},
		"line for a block":      {meter("12 V\n"), block, `reply "12 V" to "READ?": not a block`},
		"bad count":             {meter("#3x12\n"), block, `reply "#3x12"`},
		"two lines at once":     {meter("1\n2\n"), number, `more came at once after it: "2"`},
		"block too short":       {meter("#12abc\n"), block, `reply "#12" to "READ?": after the 2 bytes that its count promises came more, "c`},
		"binary for text":       {meter("\xfe\x01\x80\n"), number, "baud rate"},
		"too long a line":       {meter(strings.Repeat("9", 2000) + "\n"), number, "longer than allowed"},
		"too long a block":      {meter("#41001" + strings.Repeat("x", 1001) + "\n"), block, "longer than allowed"},
		"web server":            {answering(func(string) string { return "HTTP/1.1 400 Bad Request\r\n" }), id, "not an instrument's identity"},
		"no entry in the queue": {answering(func(string) string { return "7\n" }), number, `reply "7" to "SYSTem:ERRor?"`},
	} {
		t.Run(name, func(t *testing.T) {
			conn := dial(t, scpi.Options{MaxReply: 1000, Timeout: time.Second}, c.peer)
			err := c.ask(conn)
			var nonsense *scpi.ReplyError
			if !errors.As(err, &nonsense) || !strings.Contains(err.Error(), c.want) {
				t.Fatalf("%v; want a *ReplyError with %s", err, c.want)
			}
			if len(err.Error()) > 300 {
				t.Errorf("the error is %d bytes long", len(err.Error()))
			}
			if err := number(conn); !errors.Is(err, scpi.ErrOutOfStep) {
				t.Errorf("the next query gave %v; want ErrOutOfStep", err)
			}
		})
	}
}

func TestSilenceHalfAReplyAndClose(t *testing.T) {
	ctx := context.Background()
	for name, c := range map[string]struct {
		peer    func(net.Conn, *bufio.Scanner)
		want    string
		timeout bool
		is      error
	}{
		"silence": {answering(func(string) string { return "" }), `no reply to "READ?"`, true, os.ErrDeadlineExceeded},
		"half":    {meter("1.8E"), `half a reply to "READ?": "1.8E"`, true, os.ErrDeadlineExceeded},
		"closed":  {func(_ net.Conn, in *bufio.Scanner) { in.Scan() }, `closed the link at "READ?"`, false, io.EOF},
		"cut off": {func(rw net.Conn, in *bufio.Scanner) { in.Scan(); rw.Write([]byte("1.")) }, "", false, io.ErrUnexpectedEOF},
	} {
		t.Run(name, func(t *testing.T) {
			conn := dial(t, scpi.Options{Timeout: 50 * time.Millisecond}, c.peer)
			_, err := conn.QueryNumber(ctx, "READ?")
			var link *scpi.LinkError
			if !errors.As(err, &link) || !strings.Contains(err.Error(), c.want) || link.Timeout() != c.timeout || !errors.Is(err, c.is) {
				t.Errorf("%v", err)
			}
			if _, err := conn.QueryNumber(ctx, "READ?"); !errors.Is(err, scpi.ErrOutOfStep) {
				t.Errorf("the next query gave %v; want ErrOutOfStep", err)
			}
		})
	}
}

func TestContextEndsTheWait(t *testing.T) {
	silent := answering(func(string) string { return "" })
	for name, c := range map[string]struct {
		ctx  func() (context.Context, context.CancelFunc)
		want error
	}{
		"cancelled": {func() (context.Context, context.CancelFunc) {
			ctx, cancel := context.WithCancel(context.Background())
			time.AfterFunc(20*time.Millisecond, cancel)
			return ctx, cancel
		}, context.Canceled},
		"deadline": {func() (context.Context, context.CancelFunc) {
			return context.WithTimeout(context.Background(), 20*time.Millisecond)
		}, context.DeadlineExceeded},
	} {
		for _, withDeadlines := range []bool{true, false} {
			t.Run(name, func(t *testing.T) {
				near, far := pair(t)
				defer far.Close()
				go silent(far, bufio.NewScanner(far))
				var rwc io.ReadWriteCloser = near
				if !withDeadlines {
					rwc = struct{ io.ReadWriteCloser }{near}
				}
				conn, err := scpi.NewConn(rwc, scpi.Options{Timeout: time.Minute})
				if err != nil {
					t.Fatal(err)
				}
				defer conn.Close()
				ctx, cancel := c.ctx()
				defer cancel()
				if _, err := conn.QueryNumber(ctx, "READ?"); !errors.Is(err, c.want) {
					t.Errorf("%v; want %v", err, c.want)
				}
			})
		}
	}
	conn := dial(t, scpi.Options{}, meter("1\n"))
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := conn.QueryNumber(ctx, "READ?"); !errors.Is(err, context.Canceled) || conn.OutOfStep() != nil {
		t.Errorf("a context that is over: %v; nothing was sent, so the Conn must be in step: %v", err, conn.OutOfStep())
	}
}

func TestTimeoutWithoutDeadlines(t *testing.T) {
	near, far := pair(t)
	defer far.Close()
	go acquiretest.Talk(far, func(string) string { return "" })
	conn, err := scpi.NewConn(struct{ io.ReadWriteCloser }{near}, scpi.Options{Timeout: 20 * time.Millisecond})
	if err != nil {
		t.Fatal(err)
	}
	var link *scpi.LinkError
	if _, err := conn.QueryNumber(context.Background(), "READ?"); !errors.As(err, &link) || !link.Timeout() {
		t.Errorf("%v", err)
	}
	if err := conn.Resync(context.Background()); err == nil {
		t.Error("a closed link was cleared")
	}
}

func TestWrongUse(t *testing.T) {
	ctx := context.Background()
	conn := dial(t, scpi.Options{}, meter("1\n"))
	if err := conn.Command(ctx, "READ?"); err == nil {
		t.Error("a query was taken for a command")
	}
	if _, err := conn.QueryNumber(ctx, "VOLT"); err == nil {
		t.Error("a command was taken for a query")
	}
	if err := conn.Command(ctx, "DISP:TEXT", scpi.Text("x\n*RST")); err == nil {
		t.Error("an injection was sent")
	}
	if v, err := conn.QueryNumber(ctx, "READ?"); err != nil || v != 1 {
		t.Errorf("after the refusals: %g, %v", v, err)
	}
	if _, err := scpi.NewConn(nil, scpi.Options{Terminator: ";"}); err == nil {
		t.Error("a terminator of ; was taken")
	}
}
