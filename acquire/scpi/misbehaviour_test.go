package scpi_test

import (
	"bufio"
	"context"
	"errors"
	"io"
	"math"
	"net"
	"strings"
	"sync"
	"testing"
	"time"

	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
)

// script is a peer that follows a list of replies to FREQ?, each in pieces with a pause between, and is otherwise well
// behaved.
type script struct {
	greeting string        // before anything is asked
	pieces   []string      // of the reply to FREQ?
	bytes    bool          // each byte is written by itself
	wait     time.Duration // before each piece but the first
	prompt   string        // behind every reply, and once at the start
	echo     string        // what ends each message when it is repeated; "": it is not
	headers  bool          // every reply begins with the header it answers
}

func (s script) run(rw net.Conn, in *bufio.Scanner) {
	good := &acquiretest.Instrument{Identity: identity, Answers: map[string]string{"NEXT?": "2"}}
	io.WriteString(rw, s.greeting+s.prompt)
	for in.Scan() {
		message := strings.Trim(in.Text(), "\r\n")
		if s.echo != "" {
			io.WriteString(rw, message+s.echo)
		}
		if message == "" {
			continue
		}
		pieces := s.pieces
		if message != "FREQ?" {
			reply := good.Answer(message)
			if s.headers && reply != "" {
				reply = ":" + strings.ToUpper(strings.TrimSuffix(message, "?")) + " " + reply
			}
			pieces = []string{reply}
		}
		for i, piece := range pieces {
			if i > 0 {
				time.Sleep(s.wait)
			}
			if s.bytes {
				for j := range len(piece) {
					io.WriteString(rw, piece[j:j+1])
				}
			} else if piece != "" {
				io.WriteString(rw, piece)
			}
		}
		if s.prompt != "" {
			io.WriteString(rw, s.prompt)
		}
	}
}

// TestMisbehaviour is every way to misbehave that real instruments are known for, in one table: what is taken, and
// what is refused with which words. After each, the instrument's next reply is its own, never one from before.
func TestMisbehaviour(t *testing.T) {
	const timeout = 600 * time.Millisecond
	const most = timeout / 2
	none := math.NaN()
	for name, c := range map[string]struct {
		peer  script
		opt   scpi.Options
		block string  // wanted of a block query; "": a number is asked for
		want  float64 // of a number query; NaN: ErrNoReading
		err   string  // in the error; "": none
	}{
		"ended by LF":                        {peer: script{pieces: []string{"1.5\n"}}, want: 1.5},
		"ended by CR LF":                     {peer: script{pieces: []string{"1.5\r\n"}}, want: 1.5},
		"ended by CR":                        {peer: script{pieces: []string{"1.5\r"}}, want: 1.5},
		"ended by CR, LF late":               {peer: script{pieces: []string{"1.5\r", "\n"}, wait: most}, want: 1.5},
		"ended by nothing":                   {peer: script{pieces: []string{"1.5"}}, err: `half a reply to "FREQ?": "1.5" and then silence`},
		"no reply at all":                    {peer: script{}, err: `no reply to "FREQ?"`},
		"two lines at once":                  {peer: script{pieces: []string{"1.5\n2.5\n"}}, err: `more came at once after it: "2.5`},
		"the second line late":               {peer: script{pieces: []string{"1.5\n", "2.5\n"}, wait: most / 4}, err: `reply "2.5" to "SYSTem:ERRor?"`},
		"the second line late, no queue":     {peer: script{pieces: []string{"1.5\n", "2.5\n"}, wait: most / 4}, opt: scpi.Options{NoErrorQueue: true}, want: 1.5},
		"empty lines before":                 {peer: script{pieces: []string{"\r\n\n1.5\n"}}, want: 1.5},
		"a space before":                     {peer: script{pieces: []string{" 1.5\n"}}, want: 1.5},
		"a sign and a space":                 {peer: script{pieces: []string{" +1.5 \r\n"}}, want: 1.5},
		"a space before the E":               {peer: script{pieces: []string{"1.5 E+00\n"}}, want: 1.5},
		"no reading":                         {peer: script{pieces: []string{"9.91E+37\n"}}, want: none},
		"no reading, lower case":             {peer: script{pieces: []string{"9.91e37\r\n"}}, want: none},
		"infinite":                           {peer: script{pieces: []string{"-9.9E+37\n"}}, want: none},
		"infinite, one byte at a time":       {peer: script{pieces: []string{"9.90000000E+37\n"}, bytes: true}, want: none},
		"INF":                                {peer: script{pieces: []string{"INF\n"}}, err: "not a number"},
		"one byte at a time":                 {peer: script{pieces: []string{"1.5\r\n"}, bytes: true}, want: 1.5},
		"a pause in the middle":              {peer: script{pieces: []string{"1", ".5\n"}, wait: most}, want: 1.5},
		"a pause too long":                   {peer: script{pieces: []string{"1", ".5\n"}, wait: 2 * timeout}, err: `"1" and then silence`},
		"an unsolicited line at the start":   {peer: script{greeting: "Welcome\n", pieces: []string{"1.5\n"}}, err: "Welcome"},
		"an unsolicited number at the start": {peer: script{greeting: "7.5\n", pieces: []string{"1.5\n"}}, err: "reply"},
		"the same without a queue":           {peer: script{greeting: "7.5\n", pieces: []string{"1.5\n"}}, opt: scpi.Options{NoErrorQueue: true}, err: "it came before anything was asked"},
		"a reply from before":                {peer: script{pieces: []string{"", "1.5\n"}, wait: timeout + 50*time.Millisecond}, err: `no reply to "FREQ?"`},
		"the same without a queue, late":     {peer: script{pieces: []string{"", "1.5\n"}, wait: timeout + 50*time.Millisecond}, opt: scpi.Options{NoErrorQueue: true}, err: `no reply to "FREQ?"`},
		"the message repeated":               {peer: script{pieces: []string{"1.5\n"}, echo: "\r\n"}, err: "it only repeats what was sent"},
		"the message repeated, as said":      {peer: script{pieces: []string{"1.5\n"}, echo: "\r\n"}, opt: scpi.Options{Echo: true}, want: 1.5},
		"repeated, with a prompt":            {peer: script{pieces: []string{"1.5\r\n"}, echo: "\r\n", prompt: "> "}, opt: scpi.Options{Echo: true, Prompt: ">"}, want: 1.5},
		"not repeated, though so said":       {peer: script{pieces: []string{"1.5\n"}}, opt: scpi.Options{Echo: true}, err: "not the message repeated"},
		"a prompt":                           {peer: script{pieces: []string{"1.5\n"}, prompt: "> "}, err: `> `},
		"a prompt, as said":                  {peer: script{pieces: []string{"1.5\n"}, prompt: "> "}, opt: scpi.Options{Prompt: ">"}, want: 1.5},
		"a prompt of words, as said":         {peer: script{pieces: []string{"1.5\n"}, prompt: "SCPI>"}, opt: scpi.Options{Prompt: "SCPI>"}, want: 1.5},
		"a prompt on its own line, as said":  {peer: script{pieces: []string{"1.5\n"}, prompt: "\r\n> \r\n"}, opt: scpi.Options{Prompt: ">"}, want: 1.5},
		"a prompt, no queue, as said":        {peer: script{pieces: []string{"1.5\n"}, prompt: "> "}, opt: scpi.Options{Prompt: ">", NoErrorQueue: true}, want: 1.5},
		"a header":                           {peer: script{pieces: []string{"CH1:FREQ 1.5\n"}}, want: 1.5},
		"a header in long form":              {peer: script{pieces: []string{":MEASure:FREQuency 1.5\n"}}, want: 1.5},
		"headers on all replies":             {peer: script{pieces: []string{":FREQ 1.5\r\n"}, headers: true}, want: 1.5},
		"another's header":                   {peer: script{pieces: []string{"VOLT 1.5\n"}}, err: `reply "VOLT 1.5" to "FREQ?": not a number`},
		"a word that is no header":           {peer: script{pieces: []string{"ERROR 5\n"}}, err: "not a number"},
		"wrong baud rate":                    {peer: script{pieces: []string{"\xf8\x80\x1e\xe0\n"}}, err: "not text (on a serial port: check baud rate and parity)"},
		"wrong baud rate, no line end":       {peer: script{pieces: []string{"\xf8\x80\x1e\xe0"}}, err: `half a reply to "FREQ?": "\xf8\x80\x1e\xe0" and then silence`},
		"a block":                            {peer: script{pieces: []string{"#15a\nb\nc\n"}}, block: "a\nb\nc"},
		"a block without its terminator":     {peer: script{pieces: []string{"#15a\nb\nc"}}, block: "a\nb\nc"},
		"a block of line feeds":              {peer: script{pieces: []string{"#14\n\n\n\n\r\n"}}, block: "\n\n\n\n"},
		"a block one byte at a time":         {peer: script{pieces: []string{"#15a\nb\nc\n"}, bytes: true}, block: "a\nb\nc"},
		"a block with a pause":               {peer: script{pieces: []string{"#15a\n", "b\nc\n"}, wait: most}, block: "a\nb\nc"},
		"a block in slow pieces":             {peer: script{pieces: []string{"#1", "5", "a\n", "b\nc", "\n"}, wait: most}, block: "a\nb\nc"},
		"a block behind a prompt, as said":   {peer: script{pieces: []string{"#15a\nb\nc\n"}, prompt: "> "}, opt: scpi.Options{Prompt: ">"}, block: "a\nb\nc"},
		"a block repeated after, as said":    {peer: script{pieces: []string{"#15a\nb\nc\n"}, echo: "\n"}, opt: scpi.Options{Echo: true}, block: "a\nb\nc"},
		"a block that is cut short":          {peer: script{pieces: []string{"#15a\nb"}}, block: "-", err: "3 of the 5 bytes that its count promises"},
		"a block that is too long":           {peer: script{pieces: []string{"#15a\nb\ncd\n"}}, block: "-", err: `came more, "d\n"`},
	} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			ctx := context.Background()
			c.opt.Timeout = timeout
			conn := dial(t, c.opt, c.peer.run)
			if c.peer.greeting != "" {
				time.Sleep(100 * time.Millisecond) // it has come
			}
			var err error
			if c.block != "" {
				var b []byte
				if b, err = conn.QueryBlock(ctx, "FREQ?"); err == nil && string(b) != c.block {
					t.Errorf("%q; want %q", b, c.block)
				}
			} else {
				var v float64
				v, err = conn.QueryNumber(ctx, "FREQ?")
				switch {
				case math.IsNaN(c.want):
					if !errors.Is(err, scpi.ErrNoReading) || !math.IsNaN(v) {
						t.Errorf("%g, %v; want no reading", v, err)
					}
					err = nil
				case err == nil && v != c.want:
					t.Errorf("%g; want %g", v, c.want)
				}
			}
			if (err != nil) != (c.err != "") || err != nil && !strings.Contains(err.Error(), c.err) {
				t.Fatalf("%v; want %q", err, c.err)
			}
			if err == nil && name == "the second line late, no queue" {
				time.Sleep(timeout) // it comes, and the next question finds it
				if _, err = conn.QueryNumber(ctx, "NEXT?"); !errors.Is(err, scpi.ErrUnasked) {
					t.Fatalf("%v; want ErrUnasked", err)
				}
			}
			if err != nil {
				if v, err := conn.QueryNumber(ctx, "NEXT?"); !errors.Is(err, scpi.ErrOutOfStep) {
					t.Fatalf("the next query gave %g, %v; want ErrOutOfStep", v, err)
				}
				if strings.Contains(c.err, "not the message repeated") || name == "the message repeated" || name == "a prompt" {
					return // nothing of it can be understood as long as nobody says it right
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

// Between the end of one exchange and the next message lies the pace, and a context that ends leaves the Conn in step.
func TestPace(t *testing.T) {
	const pace = 60 * time.Millisecond
	var mu sync.Mutex
	var came []time.Time
	good := &acquiretest.Instrument{Identity: identity, Answers: map[string]string{"READ?": "1"}}
	conn := dial(t, scpi.Options{Pace: pace}, answering(func(m string) string {
		mu.Lock()
		came = append(came, time.Now())
		mu.Unlock()
		return good.Answer(m)
	}))
	ctx := context.Background()
	for range 2 {
		if v, err := conn.QueryNumber(ctx, "READ?"); err != nil || v != 1 {
			t.Fatal(v, err)
		}
	}
	mu.Lock()
	defer mu.Unlock()
	if len(came) != 4 {
		t.Fatalf("%d messages; want 4", len(came))
	}
	for i := range 3 {
		if d := came[i+1].Sub(came[i]); d < pace-time.Millisecond {
			t.Errorf("message %d came %s after the one before; want %s", i+2, d, pace)
		}
	}
	short, cancel := context.WithTimeout(ctx, pace/4)
	defer cancel()
	if _, err := conn.QueryNumber(short, "READ?"); !errors.Is(err, context.DeadlineExceeded) || conn.OutOfStep() != nil {
		t.Errorf("%v, %v", err, conn.OutOfStep())
	}
	if _, err := scpi.NewConn(nil, scpi.Options{Pace: -1}); err == nil {
		t.Error("a negative pace was taken")
	}
}

// The queue's entries come out as the instrument wrote them, long ones whole.
func TestQueueVerbatim(t *testing.T) {
	text := "Data out of range;" + strings.Repeat("the voltage is above the protection limit; ", 5)
	queue := []string{`-222,"` + text + `"`, `+310,"Fan"`, `0,"No error"`}
	conn := dial(t, scpi.Options{}, answering(func(m string) string {
		if m != "SYSTem:ERRor?" {
			return ""
		}
		reply := queue[0]
		queue = queue[1:]
		return reply + "\n"
	}))
	var refused *scpi.InstrumentError
	err := conn.Command(context.Background(), "VOLT", scpi.Number(99))
	if !errors.As(err, &refused) || !strings.Contains(err.Error(), text) {
		t.Fatal(err)
	}
	if e := refused.Entries(); len(e) != 2 || e[0] != `-222,"`+text+`"` || e[1] != `310,"Fan"` {
		t.Errorf("%q", e)
	}
}

// Another instrument at the other end is not taken for the one before.
func TestResyncOtherInstrument(t *testing.T) {
	other := &acquiretest.Instrument{Identity: "Other Works,Supply,1,1"}
	conn := dial(t, scpi.Options{Timeout: 100 * time.Millisecond, Identity: identity}, answering(other.Answer))
	if err := conn.Resync(context.Background()); !errors.Is(err, scpi.ErrOtherInstrument) || !strings.Contains(err.Error(), "Other Works") || !strings.Contains(err.Error(), identity) {
		t.Error(err)
	}
}
