package scpi_test

import (
	"bufio"
	"context"
	"io"
	"net"
	"testing"

	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
)

// BenchmarkReading is one number read over loopback, its error queue included: two round trips.
func BenchmarkReading(b *testing.B) {
	conn, err := scpi.NewConn(loopback(b), scpi.Options{})
	if err != nil {
		b.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	for b.Loop() {
		if _, err := conn.QueryNumber(ctx, "READ?"); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkBareTwoRoundTrips is what the wire alone takes for the same.
func BenchmarkBareTwoRoundTrips(b *testing.B) {
	conn := loopback(b)
	in := bufio.NewReader(conn)
	for b.Loop() {
		for _, m := range []string{"READ?\n", "SYSTem:ERRor?\n"} {
			if _, err := io.WriteString(conn, m); err != nil {
				b.Fatal(err)
			}
			if _, err := in.ReadSlice('\n'); err != nil {
				b.Fatal(err)
			}
		}
	}
}

func BenchmarkParseNumber(b *testing.B) {
	for b.Loop() {
		if _, err := scpi.ParseNumber("+6.18000000E+07"); err != nil {
			b.Fatal(err)
		}
	}
}

// loopback gives a connection to a meter.
func loopback(b *testing.B) net.Conn {
	b.Helper()
	meter := &acquiretest.Instrument{Identity: identity, Answers: map[string]string{"READ?": "+6.18000000E+07"}}
	address := acquiretest.Serve(b, meter.Answer)
	conn, err := net.Dial("tcp", address[len("tcp://"):])
	if err != nil {
		b.Fatal(err)
	}
	b.Cleanup(func() { conn.Close() })
	return conn
}
