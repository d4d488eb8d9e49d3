package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"ringbook/store"
)

// Browsers that read nothing, or more of them than there is room for, hold nothing up.
func TestWatchManyBrowsers(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	logbookOf(t, path, 1)
	address := watching(t, "history", "--logbook", path)
	told := events(t, address)
	until(t, address, told, "trial number 0")

	// As many as may be told of changes; these read no more than that they will be.
	var idle []net.Conn
	dial := func(request string) net.Conn {
		t.Helper()
		conn, err := net.Dial("tcp", address)
		if err != nil {
			t.Fatal(err)
		}
		t.Cleanup(func() { conn.Close() })
		if _, err := io.WriteString(conn, request); err != nil {
			t.Fatal(err)
		}
		return conn
	}
	listen := "GET /events HTTP/1.1\r\nHost: " + address + "\r\n\r\n"
	for range mostListeners - 1 {
		conn := dial(listen)
		idle = append(idle, conn)
		conn.SetReadDeadline(time.Now().Add(within))
		head := make([]byte, len("HTTP/1.1 200"))
		if _, err := io.ReadFull(conn, head); err != nil || string(head) != "HTTP/1.1 200" {
			t.Fatalf("%q, %v", head, err)
		}
	}
	status := func() int {
		r, err := http.Get("http://" + address + "/events")
		if err != nil {
			t.Fatal(err)
		}
		r.Body.Close()
		return r.StatusCode
	}
	becomes := func(want int) {
		t.Helper()
		deadline := time.Now().Add(within)
		for status() != want {
			if time.Now().After(deadline) {
				t.Fatalf("asking for events never gives status %d", want)
			}
			time.Sleep(20 * time.Millisecond)
		}
	}
	becomes(http.StatusServiceUnavailable)
	idle[0].Close()
	becomes(http.StatusOK)

	// More connections than there may be: those beyond are closed at once, those within stay.
	var silent []net.Conn
	for range 2 * mostLinks {
		silent = append(silent, dial(""))
	}
	closed := 0
	for _, conn := range silent {
		conn.SetReadDeadline(time.Now().Add(50 * time.Millisecond))
		if _, err := conn.Read(make([]byte, 1)); !timedOut(err) {
			closed++
		}
	}
	if closed < mostLinks || closed == len(silent) {
		t.Errorf("%d of %d connections were closed, where there is room for %d in all", closed, len(silent), mostLinks)
	}

	// Meanwhile the one that listens is told.
	lb, err := store.Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	if _, err := lb.Add(t.Context(), watchedTrial(1)); err != nil {
		t.Fatal(err)
	}
	select {
	case <-told:
	case <-time.After(within):
		t.Fatal("a listener is not told of a trial while others idle")
	}
	for _, conn := range silent {
		conn.Close()
	}
	for deadline := time.Now().Add(within); ; time.Sleep(10 * time.Millisecond) { // until there is room again
		r, err := http.Get("http://" + address + "/")
		if err == nil {
			r.Body.Close()
			break
		}
		if time.Now().After(deadline) {
			t.Fatal(err)
		}
	}
	until(t, address, told, "trial number 1")
}

func timedOut(err error) bool {
	var late net.Error
	return errors.As(err, &late) && late.Timeout()
}

// A browser that asks for a large page and takes none of it holds up neither the others nor the end.
func TestWatchSlowBrowser(t *testing.T) {
	s := newSite("127.0.0.1:1")
	large := func(i int) []byte {
		return fmt.Appendf(nil, "<meta http-equiv=\"Content-Security-Policy\" content=\"\">\n<main>%d %s</main></body>", i, strings.Repeat("x", 32<<20))
	}
	if err := s.put(large(0)); err != nil {
		t.Fatal(err)
	}
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	address := l.Addr().String()
	s.guard = newGuard(address, "")
	ctx, stop := context.WithCancel(t.Context())
	ended := make(chan error, 1)
	go func() { ended <- s.serve(ctx, l) }()
	for range 4 {
		conn, err := net.Dial("tcp", address)
		if err != nil {
			t.Fatal(err)
		}
		defer conn.Close()
		io.WriteString(conn, "GET / HTTP/1.1\r\nHost: "+address+"\r\n\r\n")
	}
	told := events(t, address)
	first := <-told
	if err := s.put(large(1)); err != nil {
		t.Fatal(err)
	}
	select {
	case second := <-told:
		if second == first {
			t.Error("two pages have one version")
		}
	case <-time.After(within):
		t.Fatal("a slow browser holds up another")
	}
	if err := s.put(large(1)); err != nil {
		t.Fatal(err)
	}
	select {
	case v := <-told:
		t.Errorf("the same page is told of again: %s", v)
	case <-time.After(300 * time.Millisecond):
	}
	stop()
	select {
	case err := <-ended:
		if err != nil {
			t.Error(err)
		}
	case <-time.After(within):
		t.Fatal("a slow browser holds up the end")
	}
}

// What is no woven page is not served half.
func TestWatchedRefusesOtherHTML(t *testing.T) {
	for _, bad := range []string{"", "<main></main></body>", "<meta http-equiv=\"Content-Security-Policy\" content=\"\">\n<main>", "<meta http-equiv=\"Content-Security-Policy\""} {
		if _, err := watched([]byte(bad), "1"); err == nil {
			t.Errorf("%q is served", bad)
		}
	}
}
