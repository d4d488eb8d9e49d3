package scpi_test

import (
	"bufio"
	"context"
	"io"
	"net"
	"strings"
	"testing"
	"time"

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

// BenchmarkBlock reads a 10 MB block over loopback TCP into memory, in turn with the bare bytes of the same by
// io.ReadFull from the socket into memory that is used again, and reports its rate as a fraction of theirs. QueryBlock
// goes into new memory each time, QueryBlockInto into the bare one's.
func BenchmarkBlock(b *testing.B) {
	const size = 10_000_000
	conn := blocks(b, size)
	room := make([]byte, size+len("#810000000\n"))
	bare := func() error {
		if _, err := io.WriteString(conn, "READ?\n"); err != nil {
			return err
		}
		_, err := io.ReadFull(conn, room)
		return err
	}
	dialogue, err := scpi.NewConn(conn, scpi.Options{})
	if err != nil {
		b.Fatal(err)
	}
	ctx := context.Background()
	for name, read := range map[string]func() error{
		"QueryBlock": func() error {
			_, err := dialogue.QueryBlock(ctx, "READ?")
			return err
		},
		"QueryBlockInto": func() error {
			_, err := dialogue.QueryBlockInto(ctx, room, "READ?")
			return err
		},
	} {
		b.Run(name, func(b *testing.B) {
			b.SetBytes(size)
			var ours, theirs time.Duration
			for b.Loop() {
				begun := time.Now()
				if err := bare(); err != nil {
					b.Fatal(err)
				}
				middle := time.Now()
				if err := read(); err != nil {
					b.Fatal(err)
				}
				theirs += middle.Sub(begun)
				ours += time.Since(middle)
			}
			b.ReportMetric(theirs.Seconds()/ours.Seconds(), "of-bare-rate")
			b.ReportMetric(size*float64(b.N)/ours.Seconds()/1e6, "MB/s-block")
			b.ReportMetric(size*float64(b.N)/theirs.Seconds()/1e6, "MB/s-bare")
		})
	}
}

// blocks gives a connection to an instrument that answers READ? with a block and knows an error queue.
func blocks(b *testing.B, size int) net.Conn {
	b.Helper()
	reply := []byte(block(strings.Repeat("\x0a\x80\x7f\xff", size/4)) + "\n")
	listener, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		b.Fatal(err)
	}
	defer listener.Close()
	conn, err := net.Dial("tcp", listener.Addr().String())
	if err != nil {
		b.Fatal(err)
	}
	far, err := listener.Accept()
	if err != nil {
		b.Fatal(err)
	}
	go func() {
		defer far.Close()
		for in := bufio.NewScanner(far); in.Scan(); {
			answer := []byte("0,\"No error\"\n")
			if in.Text() == "READ?" {
				answer = reply
			}
			if _, err := far.Write(answer); err != nil {
				return
			}
		}
	}()
	b.Cleanup(func() { conn.Close() })
	return conn
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
