package main

import (
	"bytes"
	"context"
	"crypto/sha256"
	_ "embed"
	"encoding/base64"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"log"
	"net"
	"net/http"
	"sync"
	"sync/atomic"
	"time"
)

const (
	mostListeners = 16 // browsers' pages that are told of changes
	mostLinks     = 64 // connections in all

	readWithin  = 5 * time.Second  // a request's head
	writeWithin = 10 * time.Second // an answer, or one event of the stream, or the browser is given up
	assureEvery = 15 * time.Second // something is written, so that a dead browser is found out
	endWithin   = 2 * time.Second  // for answers under way when the program ends
)

//go:embed page_watch.js
var watchScript string

// site is a page that changes, as browsers on this computer see it: the page at /, and at /events a stream of server-sent
// events (HTML Living Standard of the WHATWG, 9.2), each the version of the page that stands.
type site struct {
	guard     guard
	listeners atomic.Int64
	ended     chan struct{} // closed when it is served no more

	mu      sync.Mutex
	page    []byte
	version string        // of the page; no two pages have the same
	changed chan struct{} // closed when another page stands
}

func newSite(address string) *site {
	sum := sha256.Sum256([]byte(watchScript))
	return &site{
		guard:   newGuard(address, base64.StdEncoding.EncodeToString(sum[:])),
		ended:   make(chan struct{}),
		changed: make(chan struct{}),
	}
}

// put makes a woven page the one that stands, and tells all listeners, where it is another one.
func (s *site) put(html []byte) error {
	sum := sha256.Sum256(html)
	version := hex.EncodeToString(sum[:8])
	served, err := watched(html, version)
	if err != nil {
		return err
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if version == s.version {
		return nil
	}
	s.page, s.version = served, version
	close(s.changed)
	s.changed = make(chan struct{})
	return nil
}

// now is the page that stands, its version, and what is closed when another one does.
func (s *site) now() ([]byte, string, <-chan struct{}) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.page, s.version, s.changed
}

// watched is a woven page with the script that takes it anew. The policy that a page carries allows no script, so that of the
// header takes its place.
func watched(html []byte, version string) ([]byte, error) {
	before, rest, found := bytes.Cut(html, []byte(`<meta http-equiv="Content-Security-Policy"`))
	_, after, closed := bytes.Cut(rest, []byte(">\n"))
	head, main, opened := bytes.Cut(after, []byte("<main>"))
	last := bytes.LastIndex(main, []byte("</body>"))
	if !found || !closed || !opened || last < 0 {
		return nil, errors.New("watching a page: its HTML has not the parts that a woven page has")
	}
	var b bytes.Buffer
	b.Write(before)
	b.WriteString("<link rel=\"icon\" href=\"data:,\">\n")
	b.Write(head)
	fmt.Fprintf(&b, "<main data-version=%q>", version)
	b.Write(main[:last])
	b.WriteString("<script>" + watchScript + "</script>\n")
	b.Write(main[last:])
	return b.Bytes(), nil
}

// serve serves the site until ctx ends.
func (s *site) serve(ctx context.Context, l net.Listener) error {
	var links atomic.Int64
	server := &http.Server{
		Handler:                      s,
		DisableGeneralOptionsHandler: true, // ServeHTTP answers all
		ReadHeaderTimeout:            readWithin,
		WriteTimeout:                 writeWithin, // from the request on; tell puts it off
		IdleTimeout:                  time.Minute,
		MaxHeaderBytes:               16 << 10,
		ErrorLog:                     log.New(io.Discard, "", 0), // a browser that goes away is no news
		ConnState: func(c net.Conn, state http.ConnState) {
			switch state {
			case http.StateNew:
				if links.Add(1) > mostLinks {
					c.Close()
				}
			case http.StateClosed, http.StateHijacked:
				links.Add(-1)
			}
		},
	}
	served := make(chan error, 1)
	go func() { served <- server.Serve(l) }()
	select {
	case err := <-served:
		close(s.ended)
		return fmt.Errorf("page: serving it: %w", err)
	case <-ctx.Done():
	}
	close(s.ended)
	grace, cancel := context.WithTimeout(context.WithoutCancel(ctx), endWithin)
	defer cancel()
	if server.Shutdown(grace) != nil { // a browser that takes its time
		server.Close()
	}
	<-served
	return nil
}

// ServeHTTP answers a request that the guard lets through.
func (s *site) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	if !s.guard.admits(w, r) {
		return
	}
	switch r.URL.Path {
	case "/":
		page, _, _ := s.now()
		w.Header().Set("Content-Type", "text/html; charset=utf-8")
		w.Header().Set("Content-Length", fmt.Sprint(len(page)))
		if r.Method == http.MethodHead {
			return
		}
		w.Write(page) // a browser that goes away takes nothing
	case "/events":
		s.tell(w, r)
	default:
		http.Error(w, "there is nothing at this address but the page at /", http.StatusNotFound)
	}
}

// tell tells one browser of each page that comes to stand, until it goes away.
func (s *site) tell(w http.ResponseWriter, r *http.Request) {
	if s.listeners.Add(1) > mostListeners {
		s.listeners.Add(-1)
		w.Header().Set("Retry-After", "5")
		http.Error(w, "too many browsers watch this page; close some", http.StatusServiceUnavailable)
		return
	}
	defer s.listeners.Add(-1)
	w.Header().Set("Content-Type", "text/event-stream")
	if r.Method == http.MethodHead {
		return
	}
	control := http.NewResponseController(w)
	write := func(text string) bool {
		if control.SetWriteDeadline(time.Now().Add(writeWithin)) != nil {
			return false
		}
		if _, err := io.WriteString(w, text); err != nil {
			return false
		}
		return control.Flush() == nil
	}
	assure := time.NewTicker(assureEvery)
	defer assure.Stop()
	_, version, changed := s.now()
	if !write("retry: 2000\ndata: " + version + "\n\n") {
		return
	}
	for {
		ok := true
		select {
		case <-s.ended:
			return
		case <-r.Context().Done():
			return
		case <-changed: // of several pages since, the last
			_, version, changed = s.now()
			ok = write("data: " + version + "\n\n")
		case <-assure.C:
			ok = write(":\n\n")
		}
		if !ok {
			return
		}
	}
}
