package acquiretest_test

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"os"
	"strings"
	"testing"
	"time"

	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
)

// fakeT keeps what a test would have failed with.
type fakeT struct {
	failures []string
	cleanups []func()
}

func (f *fakeT) Helper()                   {}
func (f *fakeT) Errorf(s string, a ...any) { f.failures = append(f.failures, fmt.Sprintf(s, a...)) }
func (f *fakeT) Cleanup(fn func())         { f.cleanups = append(f.cleanups, fn) }
func (f *fakeT) end() {
	for _, fn := range f.cleanups {
		fn()
	}
}
func (f *fakeT) wants(t *testing.T, s string) {
	t.Helper()
	f.end()
	if all := strings.Join(f.failures, "\n"); !strings.Contains(all, s) || s == "" && all != "" {
		t.Errorf("failures:\n%s\nwant one with %q", all, s)
	}
}

func counter() *acquiretest.Instrument {
	return &acquiretest.Instrument{
		Identity: "Example Works,Counter 1,0001,1.0",
		Answers: map[string]string{
			"MEASure:FREQuency?": "+6.18000000E+07",
			"CURVe?":             "#15a\nb\xffc",
		},
		Commands: map[string]string{"INPut:IMPedance 5.0E+01": ""},
	}
}

// dialogue is what the recording test does, so that it can be done again against the playback.
func dialogue(t *testing.T, link io.ReadWriteCloser) {
	t.Helper()
	ctx := context.Background()
	conn, err := scpi.NewConn(link, scpi.Options{Timeout: 2 * time.Second})
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close()
	if id, err := conn.Identity(ctx); err != nil || id != "Example Works,Counter 1,0001,1.0" {
		t.Errorf("identity %q, %v", id, err)
	}
	if err := conn.Command(ctx, "INPut:IMPedance", scpi.Number(50)); err != nil {
		t.Error(err)
	}
	if v, err := conn.QueryNumber(ctx, "MEASure:FREQuency?"); err != nil || v != 61.8e6 {
		t.Errorf("frequency %g, %v", v, err)
	}
	if b, err := conn.QueryBlock(ctx, "CURVe?"); err != nil || string(b) != "a\nb\xffc" {
		t.Errorf("block %q, %v", b, err)
	}
	if err := conn.Command(ctx, "NONsense"); err == nil || !strings.Contains(err.Error(), "-113") {
		t.Errorf("an unknown command gave %v", err)
	}
}

func TestRecordThenPlayback(t *testing.T) {
	link, err := wire.Open(context.Background(), acquiretest.Serve(t, counter().Answer))
	if err != nil {
		t.Fatal(err)
	}
	var file bytes.Buffer
	dialogue(t, acquiretest.Record(link, &file))
	if !strings.Contains(file.String(), "> \"INPut:IMPedance 5.0E+01\\n\"\n") {
		t.Errorf("recorded:\n%s", file.String())
	}
	dialogue(t, acquiretest.Playback(t, &file))
}

// The file in testdata is the same dialogue, with a comment.
func TestPlaybackFile(t *testing.T) {
	f, err := os.Open("testdata/counter.txt")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	dialogue(t, acquiretest.Playback(t, f))
}

func TestRecordTimeoutAndClose(t *testing.T) {
	link, err := wire.Open(context.Background(), acquiretest.Serve(t, func(m string) string { return "" }))
	if err != nil {
		t.Fatal(err)
	}
	var file bytes.Buffer
	rec := acquiretest.Record(link, &file)
	rec.SetDeadline(time.Now().Add(time.Millisecond))
	buf := make([]byte, 8)
	if _, err := rec.Read(buf); !os.IsTimeout(err) {
		t.Errorf("read gave %v", err)
	}
	rec.Close()
	rec.Read(buf)
	if got := file.String(); got != "! timeout\n! closed\n" {
		t.Errorf("recorded %q", got)
	}
	play := acquiretest.Playback(t, &file)
	if _, err := play.Read(buf); !os.IsTimeout(err) {
		t.Errorf("first read gave %v", err)
	}
	if _, err := play.Read(buf); err != io.EOF {
		t.Errorf("second read gave %v", err)
	}
}

func TestPlaybackFails(t *testing.T) {
	const file = "> \"*IDN?\\n\"\n< \"a,b,c,d\\n\"\n"
	buf := make([]byte, 64)
	for _, c := range []struct {
		name, file, want string
		do               func(p *acquiretest.Player)
	}{
		{"nothing done", file, "left unused from line 1", func(p *acquiretest.Player) {}},
		{"half done", file, "left unused from line 2", func(p *acquiretest.Player) { p.Write([]byte("*IDN?\n")) }},
		{"half a message", file, "left unused from line 1", func(p *acquiretest.Player) { p.Write([]byte("*ID")) }},
		{"another message", file, `"*RST\n" sent where line 1`, func(p *acquiretest.Player) { p.Write([]byte("*RST\n")) }},
		{"read too soon", file, "a read where line 1", func(p *acquiretest.Player) { p.Read(buf) }},
		{"write too soon", file, `"X\n" sent where line 2`, func(p *acquiretest.Player) { p.Write([]byte("*IDN?\n")); p.Write([]byte("X\n")) }},
		{"write past the end", "", "after the dialogue's end", func(p *acquiretest.Player) { p.Write([]byte("X\n")) }},
		{"read past the end", "", "after the dialogue's end", func(p *acquiretest.Player) { p.Read(buf) }},
		{"bad quote", "> *IDN?\n", "dialogue line 1", func(p *acquiretest.Player) {}},
		{"bad mark", "# note\n? \"x\"\n", "dialogue line 2", func(p *acquiretest.Player) {}},
	} {
		t.Run(c.name, func(t *testing.T) {
			var f fakeT
			c.do(acquiretest.Playback(&f, strings.NewReader(c.file)))
			f.wants(t, c.want)
			if len(f.failures) != 1 {
				t.Errorf("%d failures, want 1: %q", len(f.failures), f.failures)
			}
		})
	}
	var f fakeT
	p := acquiretest.Playback(&f, strings.NewReader(file))
	for _, piece := range []string{"*I", "DN", "?\n"} {
		p.Write([]byte(piece))
	}
	for range 8 {
		p.Read(buf[:1])
	}
	f.wants(t, "")
}
