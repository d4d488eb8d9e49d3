//go:build linux || darwin

package wire_test

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/creack/pty"

	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
)

// terminal opens a pseudo-terminal and gives the end the instrument holds, and the address of the other.
func terminal(t *testing.T) (master *os.File, address string) {
	t.Helper()
	master, slave, err := pty.Open()
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { master.Close(); slave.Close() })
	return master, "serial://" + slave.Name() + "?baud=115200"
}

func open(t *testing.T, address string) wire.Link {
	t.Helper()
	link, err := wire.Open(context.Background(), address)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { link.Close() })
	return link
}

// allBytes holds every byte there is: none may be swallowed or translated on the way.
func allBytes() string {
	b := make([]byte, 256)
	for i := range b {
		b[i] = byte(i)
	}
	return string(b)
}

func TestSerialDialogue(t *testing.T) {
	master, address := terminal(t)
	meter := &acquiretest.Instrument{
		Identity: "Example Works,Meter 7,0042,1.3",
		Answers:  map[string]string{"READ?": "+1.5E+03", "CURVe?": "#3256" + allBytes()},
		Commands: map[string]string{"VOLT 5.0E+00": "", "VOLT 9.9E+01": `-222,"Data out of range"`},
	}
	link := open(t, address) // before the instrument speaks: opening sets the line raw
	go acquiretest.Talk(master, meter.Answer)
	ctx := context.Background()
	conn, err := scpi.NewConn(link, scpi.Options{Timeout: 3 * time.Second})
	if err != nil {
		t.Fatal(err)
	}
	if id, err := conn.Identity(ctx); err != nil || id != meter.Identity {
		t.Errorf("identity %q, %v", id, err)
	}
	for range 20 {
		if v, err := conn.QueryNumber(ctx, "READ?"); err != nil || v != 1500 {
			t.Fatalf("%g, %v", v, err)
		}
	}
	if b, err := conn.QueryBlock(ctx, "CURVe?"); err != nil || string(b) != allBytes() {
		t.Errorf("block %q, %v", b, err)
	}
	if err := conn.Command(ctx, "VOLT", scpi.Number(5)); err != nil {
		t.Error(err)
	}
	var refused *scpi.InstrumentError
	if err := conn.Command(ctx, "VOLT", scpi.Number(99)); !errors.As(err, &refused) || refused.Number != -222 {
		t.Errorf("%v", err)
	}
}

func TestSerialDeadline(t *testing.T) {
	_, address := terminal(t)
	link := open(t, address)
	buf := make([]byte, 8)
	link.SetDeadline(time.Now().Add(30 * time.Millisecond))
	if n, err := link.Read(buf); n != 0 || !errors.Is(err, os.ErrDeadlineExceeded) {
		t.Errorf("%d, %v; want os.ErrDeadlineExceeded", n, err)
	}
	link.SetDeadline(time.Unix(1, 0))
	if _, err := link.Write(buf); !errors.Is(err, os.ErrDeadlineExceeded) {
		t.Errorf("write: %v; want os.ErrDeadlineExceeded", err)
	}
	// A deadline set while a read waits ends that read.
	link.SetDeadline(time.Time{})
	time.AfterFunc(30*time.Millisecond, func() { link.SetDeadline(time.Now()) })
	if _, err := link.Read(buf); !errors.Is(err, os.ErrDeadlineExceeded) {
		t.Errorf("moved: %v; want os.ErrDeadlineExceeded", err)
	}
}

func TestSerialCancellation(t *testing.T) {
	_, address := terminal(t)
	conn, err := scpi.NewConn(open(t, address), scpi.Options{Timeout: time.Minute})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	time.AfterFunc(30*time.Millisecond, cancel)
	if _, err := conn.QueryNumber(ctx, "READ?"); !errors.Is(err, context.Canceled) {
		t.Errorf("%v; want context.Canceled", err)
	}
}

// A terminal whose far end takes nothing fills up, and the write would wait for ever.
func TestSerialStuckWrite(t *testing.T) {
	_, address := terminal(t)
	link := open(t, address)
	link.SetDeadline(time.Now().Add(100 * time.Millisecond))
	if _, err := link.Write(make([]byte, 1<<20)); !errors.Is(err, os.ErrDeadlineExceeded) {
		t.Fatalf("%v; want os.ErrDeadlineExceeded", err)
	}
	if _, err := link.Write([]byte("x")); !errors.Is(err, os.ErrDeadlineExceeded) {
		t.Errorf("a second write: %v; want os.ErrDeadlineExceeded", err)
	}
	closed := make(chan error, 1)
	go func() { closed <- link.Close() }()
	select {
	case err := <-closed:
		if err != nil {
			t.Error(err)
		}
	case <-time.After(5 * time.Second):
		t.Error("Close waits for the stuck write")
	}
}

func TestSerialCloseUnblocks(t *testing.T) {
	_, address := terminal(t)
	link := open(t, address)
	time.AfterFunc(30*time.Millisecond, func() { link.Close() })
	if _, err := link.Read(make([]byte, 8)); !errors.Is(err, os.ErrClosed) {
		t.Errorf("read: %v; want os.ErrClosed", err)
	}
	if _, err := link.Write([]byte("x")); !errors.Is(err, os.ErrClosed) {
		t.Errorf("write: %v; want os.ErrClosed", err)
	}
	if err := link.Close(); err != nil {
		t.Errorf("a second close: %v", err)
	}
}

func TestSerialUnplugged(t *testing.T) {
	master, address := terminal(t)
	link := open(t, address)
	time.AfterFunc(30*time.Millisecond, func() { master.Close() })
	_, err := link.Read(make([]byte, 8))
	if err == nil || !strings.Contains(err.Error(), "is gone") || !strings.Contains(err.Error(), "plugged in") {
		t.Errorf("read: %v", err)
	}
}

func TestSerialBusy(t *testing.T) {
	_, address := terminal(t)
	link := open(t, address)
	_, err := wire.Open(context.Background(), address)
	var busy *wire.OpenError
	if !errors.As(err, &busy) || !strings.Contains(err.Error(), "in use by another program") {
		t.Fatalf("a second open gave %v", err)
	}
	link.Close()
	again, err := wire.Open(context.Background(), address)
	if err != nil {
		t.Fatalf("after the first was closed: %v", err)
	}
	again.Close()
}

func TestSerialErrors(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "file")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	for device, want := range map[string]string{
		filepath.Join(dir, "ttyUSB9"): "there is no such device: check that the adapter is plugged in",
		file:                          "it is not a serial port",
		"/dev/null":                   "it is not a serial port",
	} {
		_, err := wire.Open(context.Background(), "serial://"+device)
		var open *wire.OpenError
		if !errors.As(err, &open) || !strings.Contains(err.Error(), want) || !strings.Contains(err.Error(), device) {
			t.Errorf("%s: %v; want %s", device, err, want)
		}
	}
}

// A pause in the middle of a reply is longer than one wait of the port and shorter than the deadline; and the bytes come
// one by one.
func TestSerialPauseInReply(t *testing.T) {
	master, address := terminal(t)
	link := open(t, address)
	go func() {
		buf := make([]byte, 64)
		for {
			n, err := master.Read(buf)
			if err != nil {
				return
			}
			reply := "0,\"No error\"\r\n"
			if strings.HasPrefix(string(buf[:n]), "READ?") {
				reply = "+1.5E+03\r\n"
			}
			for i := range len(reply) {
				if i == 4 {
					time.Sleep(150 * time.Millisecond)
				}
				master.WriteString(reply[i : i+1])
			}
		}
	}()
	conn, err := scpi.NewConn(link, scpi.Options{Timeout: 3 * time.Second})
	if err != nil {
		t.Fatal(err)
	}
	for range 3 {
		if v, err := conn.QueryNumber(context.Background(), "READ?"); err != nil || v != 1500 {
			t.Fatalf("%g, %v", v, err)
		}
	}
}
