package device

import (
	"bufio"
	"context"
	"errors"
	"net"
	"strings"
	"testing"
	"time"
)

// TestServe speaks over a socket: split and joined messages, a message longer than the buffer, and a
// cancelled context that lets every client go.
func TestServe(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	in := meter(t)
	done := make(chan error, 1)
	go func() { done <- in.ServeListener(ctx, ln) }()
	conn, err := net.Dial("tcp", ln.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close()
	conn.SetDeadline(time.Now().Add(10 * time.Second))
	r := bufio.NewReader(conn)
	ask := func(parts ...string) string {
		t.Helper()
		for _, p := range parts {
			if _, err := conn.Write([]byte(p)); err != nil {
				t.Fatal(err)
			}
		}
		line, err := r.ReadString('\n')
		if err != nil {
			t.Fatal(err)
		}
		return line
	}
	if got := ask("MEAS:", "VOLT", "?\nMEAS:FREQ?\n"); got != "1.5\n" {
		t.Errorf("first reply %q", got)
	}
	if got := ask(); got != "2.5\n" {
		t.Errorf("second reply %q", got)
	}
	if got := ask("VOLT "+strings.Repeat("1", 3*longestMessage), "\nSYST:ERR?\n"); !strings.HasPrefix(got, `-363,"Input buffer overrun`) {
		t.Errorf("after a long message: %q", got)
	}
	other, err := net.Dial("tcp", ln.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	other.Write([]byte("*IDN?")) // left without its terminator
	other.Close()
	if got := ask("SYST:ERR?\n"); got != "0,\"No error\"\n" {
		t.Errorf("after half a message from another client: %q", got)
	}
	cancel()
	if err := <-done; !errors.Is(err, context.Canceled) {
		t.Errorf("the listener ended with %v", err)
	}
	if _, err := r.ReadString('\n'); err == nil {
		t.Error("the client was not let go")
	}
}
