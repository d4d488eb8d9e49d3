package main

import (
	"bufio"
	"io"
	"net"
	"net/http"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// ask sends a request as it stands and gives the answer; HOST in it is the address.
func ask(t *testing.T, address, request string) (status int, header http.Header, body string) {
	t.Helper()
	conn, err := net.Dial("tcp", address)
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close()
	conn.SetDeadline(time.Now().Add(within))
	if _, err := io.WriteString(conn, strings.ReplaceAll(strings.ReplaceAll(request, "HOST", address), "\n", "\r\n")); err != nil {
		t.Fatal(err)
	}
	method, _, _ := strings.Cut(request, " ")
	r, err := http.ReadResponse(bufio.NewReader(conn), &http.Request{Method: method})
	if err != nil {
		t.Fatalf("%q: %v", request, err)
	}
	head := make([]byte, 1<<16)
	if r.Header.Get("Content-Type") != "text/event-stream" { // which has no end
		defer r.Body.Close()
		n, err := io.ReadFull(r.Body, head)
		if err != nil && err != io.EOF && err != io.ErrUnexpectedEOF {
			t.Fatal(err)
		}
		body = string(head[:n])
	}
	return r.StatusCode, r.Header, body
}

// TestWatchGuard sends what a hostile page in the same browser could, and what no browser would.
func TestWatchGuard(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	logbookOf(t, path, 1)
	address := watching(t, "history", "--logbook", path)
	until(t, address, events(t, address), "trial number 0")
	_, port, _ := net.SplitHostPort(address)
	for _, c := range []struct {
		name, request string
		want          int
	}{
		{"the page", "GET / HTTP/1.1\nHost: HOST\n\n", 200},
		{"by name", "GET / HTTP/1.1\nHost: LocalHost:" + port + "\n\n", 200},
		{"IPv6", "GET / HTTP/1.1\nHost: [::1]:" + port + "\n\n", 200},
		{"a query", "GET /?x=1 HTTP/1.1\nHost: HOST\n\n", 200},
		{"head", "HEAD / HTTP/1.1\nHost: HOST\n\n", 200},
		{"own origin", "GET /events HTTP/1.1\nHost: HOST\nOrigin: http://HOST\nSec-Fetch-Site: same-origin\n\n", 200},
		{"the head of the events", "HEAD /events HTTP/1.1\nHost: HOST\n\n", 200},
		{"a link followed", "GET / HTTP/1.1\nHost: HOST\nSec-Fetch-Site: cross-site\nSec-Fetch-Mode: navigate\nSec-Fetch-Dest: document\n\n", 200},
		{"an address typed", "GET / HTTP/1.1\nHost: HOST\nSec-Fetch-Site: none\nSec-Fetch-Mode: navigate\n\n", 200},

		{"rebound name", "GET / HTTP/1.1\nHost: attacker.invalid:" + port + "\n\n", 421},
		{"rebound name, no port", "GET / HTTP/1.1\nHost: attacker.invalid\n\n", 421},
		{"a name that begins like ours", "GET / HTTP/1.1\nHost: 127.0.0.1.attacker.invalid:" + port + "\n\n", 421},
		{"another port", "GET / HTTP/1.1\nHost: 127.0.0.1:1\n\n", 421},
		{"no port", "GET / HTTP/1.1\nHost: 127.0.0.1\n\n", 421},
		{"user in the host", "GET / HTTP/1.1\nHost: x@HOST\n\n", 400},
		{"trailing dot", "GET / HTTP/1.1\nHost: localhost.:" + port + "\n\n", 421},
		{"empty host", "GET / HTTP/1.1\nHost: \n\n", 421},
		{"no host", "GET / HTTP/1.1\n\n", 400},
		{"no host, old", "GET / HTTP/1.0\n\n", 421},
		{"two hosts", "GET / HTTP/1.1\nHost: HOST\nHost: attacker.invalid\n\n", 400},
		{"proxy request", "GET http://attacker.invalid/ HTTP/1.1\nHost: HOST\n\n", 421},
		{"tunnel", "CONNECT attacker.invalid:443 HTTP/1.1\nHost: HOST\n\n", 421},

		{"foreign origin", "GET / HTTP/1.1\nHost: HOST\nOrigin: http://attacker.invalid\n\n", 403},
		{"origin of no site", "GET / HTTP/1.1\nHost: HOST\nOrigin: null\n\n", 403},
		{"origin of another port", "GET /events HTTP/1.1\nHost: HOST\nOrigin: http://127.0.0.1:1\n\n", 403},
		{"origin by TLS", "GET / HTTP/1.1\nHost: HOST\nOrigin: https://HOST\n\n", 403},
		{"two origins", "GET / HTTP/1.1\nHost: HOST\nOrigin: http://HOST\nOrigin: http://attacker.invalid\n\n", 403},
		{"as a foreign page's picture", "GET /events HTTP/1.1\nHost: HOST\nSec-Fetch-Site: cross-site\nSec-Fetch-Mode: no-cors\nSec-Fetch-Dest: image\n\n", 403},
		{"in a foreign page's frame", "GET / HTTP/1.1\nHost: HOST\nSec-Fetch-Site: cross-site\nSec-Fetch-Mode: navigate\nSec-Fetch-Dest: iframe\n\n", 403},
		{"from another port's page", "GET / HTTP/1.1\nHost: HOST\nSec-Fetch-Site: same-site\nSec-Fetch-Mode: cors\n\n", 403},

		{"post", "POST / HTTP/1.1\nHost: HOST\nContent-Length: 0\n\n", 405},
		{"post that never comes", "POST / HTTP/1.1\nHost: HOST\nContent-Length: 1000000\n\n", 405},
		{"put", "PUT /events HTTP/1.1\nHost: HOST\nContent-Length: 1\n\nx", 405},
		{"delete", "DELETE / HTTP/1.1\nHost: HOST\n\n", 405},
		{"options", "OPTIONS * HTTP/1.1\nHost: HOST\n\n", 405},
		{"content with get", "GET / HTTP/1.1\nHost: HOST\nContent-Length: 1000000\n\n", 413},
		{"content without end", "GET / HTTP/1.1\nHost: HOST\nTransfer-Encoding: chunked\n\n", 413},

		{"traversal", "GET /../ringbook.db HTTP/1.1\nHost: HOST\n\n", 404},
		{"traversal, encoded", "GET /%2e%2e/%2e%2e/etc/passwd HTTP/1.1\nHost: HOST\n\n", 404},
		{"the logbook", "GET /ringbook.db HTTP/1.1\nHost: HOST\n\n", 404},
		{"a path like ours", "GET //events HTTP/1.1\nHost: HOST\n\n", 404},
		{"below ours", "GET /events/ HTTP/1.1\nHost: HOST\n\n", 404},
		{"a long head", "GET / HTTP/1.1\nHost: HOST\nX: " + strings.Repeat("x", 1<<16) + "\n\n", 431},
		{"nonsense", "\x16\x03\x01 / HTTP/1.1\n\n", 400},
	} {
		t.Run(c.name, func(t *testing.T) {
			status, header, body := ask(t, address, c.request)
			if status != c.want {
				t.Errorf("status %d, want %d: %s", status, c.want, body)
			}
			if status != 200 && strings.Contains(body, "trial number") {
				t.Errorf("the page comes with status %d", status)
			}
			if status == 400 || status == 431 { // answered before the guard
				return
			}
			for name, want := range map[string]string{
				"X-Content-Type-Options": "nosniff", "Referrer-Policy": "no-referrer", "Cross-Origin-Resource-Policy": "same-origin",
				"Cross-Origin-Opener-Policy": "same-origin", "Cache-Control": "no-store", "X-Frame-Options": "DENY",
			} {
				if got := header.Get(name); got != want {
					t.Errorf("%s: %q, want %q", name, got, want)
				}
			}
			policy := header.Get("Content-Security-Policy")
			if !strings.HasPrefix(policy, "default-src 'none'; script-src 'sha256-") || strings.Contains(policy, "unsafe-eval") {
				t.Errorf("policy %q", policy)
			}
			if header.Get("Access-Control-Allow-Origin") != "" {
				t.Error("another site is let in")
			}
		})
	}
}
