package main

import (
	"net"
	"net/http"
	"slices"
	"strings"
	"time"
)

// guard keeps everyone from the page but a browser of this computer that was given its address. A page from elsewhere that is
// open in the same browser can send requests here, and can have its own name point here (DNS rebinding): so the Host header
// must name this address, and an Origin header this site (RFC 9110, 7.2; RFC 6454, 7).
type guard struct {
	hosts  []string // what a Host header may say
	policy string
}

// newGuard guards a site at an address of the loopback interface. scriptHash is the SHA-256 of its only script, in base64.
func newGuard(address, scriptHash string) guard {
	_, port, _ := net.SplitHostPort(address) // it is a listener's own
	g := guard{hosts: []string{address, "127.0.0.1:" + port, "localhost:" + port, "[::1]:" + port}}
	if port == "80" { // which a browser leaves out
		for _, h := range g.hosts[:4:4] {
			g.hosts = append(g.hosts, strings.TrimSuffix(h, ":80"))
		}
	}
	// Content Security Policy Level 3, W3C: nothing from elsewhere, nothing to elsewhere, one script and that as it is.
	g.policy = "default-src 'none'; script-src 'sha256-" + scriptHash + "'; connect-src 'self'; style-src 'unsafe-inline'; " +
		"img-src data:; base-uri 'none'; form-action 'none'; frame-ancestors 'none'"
	return g
}

// admits says whether a request may be answered, and has answered it where it may not.
func (g guard) admits(w http.ResponseWriter, r *http.Request) bool {
	h := w.Header()
	h.Set("Content-Security-Policy", g.policy)
	h.Set("X-Content-Type-Options", "nosniff")
	h.Set("Referrer-Policy", "no-referrer")
	h.Set("Cross-Origin-Opener-Policy", "same-origin")
	h.Set("Cross-Origin-Embedder-Policy", "require-corp")
	h.Set("Cross-Origin-Resource-Policy", "same-origin")
	h.Set("X-Frame-Options", "DENY")
	h.Set("Cache-Control", "no-store")
	refuse := func(code int, why string) bool {
		h.Set("Connection", "close")
		_ = http.NewResponseController(w).SetReadDeadline(time.Now()) // what content the request has is not waited for
		http.Error(w, why, code)
		return false
	}
	switch {
	case !slices.Contains(g.hosts, strings.ToLower(r.Host)):
		return refuse(http.StatusMisdirectedRequest, "this page is served to this computer alone; open the address that ringbook printed")
	case !g.ours(r.Header):
		return refuse(http.StatusForbidden, "another site may not ask for this page")
	case r.Method != http.MethodGet && r.Method != http.MethodHead:
		h.Set("Allow", "GET, HEAD")
		return refuse(http.StatusMethodNotAllowed, "this page can be read, and nothing else")
	case r.ContentLength != 0:
		return refuse(http.StatusRequestEntityTooLarge, "a request for this page has no content")
	}
	return true
}

// ours says whether a request comes from this site, or from nobody: an address that was typed.
func (g guard) ours(h http.Header) bool {
	for _, origin := range h.Values("Origin") {
		host, ok := strings.CutPrefix(strings.ToLower(origin), "http://")
		if !ok || !slices.Contains(g.hosts, host) {
			return false
		}
	}
	// Not every request has an Origin; a browser says of each where it came from (Fetch Metadata, W3C). A link followed to
	// here is no harm: the page cannot be framed, nor read from there.
	switch h.Get("Sec-Fetch-Site") {
	case "", "none", "same-origin":
		return true
	}
	return h.Get("Sec-Fetch-Mode") == "navigate" && h.Get("Sec-Fetch-Dest") == "document"
}
