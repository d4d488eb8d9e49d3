package wire_test

import (
	"context"
	"errors"
	"net"
	"strings"
	"testing"
	"time"

	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
)

func TestTCP(t *testing.T) {
	counter := &acquiretest.Instrument{Identity: "Example Works,Counter 1,0001,1.0", Answers: map[string]string{"READ?": "6.18E+7"}}
	address := acquiretest.Serve(t, counter.Answer)
	visa := "TCPIP::127.0.0.1::" + address[strings.LastIndexByte(address, ':')+1:] + "::SOCKET"
	for _, a := range []string{address, visa} {
		link, err := wire.Open(context.Background(), a)
		if err != nil {
			t.Fatal(err)
		}
		conn, err := scpi.NewConn(link, scpi.Options{})
		if err != nil {
			t.Fatal(err)
		}
		if v, err := conn.QueryNumber(context.Background(), "READ?"); err != nil || v != 61.8e6 {
			t.Errorf("%s: %g, %v", a, v, err)
		}
		conn.Close()
	}
}

func TestTCPErrors(t *testing.T) {
	free, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	refused := "tcp://" + free.Addr().String()
	free.Close()
	for address, want := range map[string]string{
		refused:                      "connection refused, so nothing listens at port",
		"tcp://no-such-host.invalid": "no host called no-such-host.invalid",
	} {
		_, err := wire.Open(context.Background(), address)
		var open *wire.OpenError
		if !errors.As(err, &open) || open.Cure == "" || !strings.Contains(err.Error(), want) || !strings.Contains(err.Error(), address) {
			t.Errorf("%s: %v", address, err)
		}
	}
	if _, err := wire.Open(context.Background(), "gibberish"); err == nil || !strings.Contains(err.Error(), `"gibberish"`) {
		t.Errorf("%v", err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := wire.Open(ctx, refused); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	// 192.0.2.0/24 is TEST-NET-1 of RFC 5737: nobody answers there, or the network says so at once.
	short, cancel := context.WithTimeout(context.Background(), 50*time.Millisecond)
	defer cancel()
	if _, err := wire.Open(short, "tcp://192.0.2.1:5025"); err == nil {
		t.Error("TEST-NET-1 answered")
	}
}
