package main

import (
	"path/filepath"
	"strings"
	"testing"
	"time"

	"ringbook/snubber"
	"ringbook/store"
)

// A trial that is logged is on the watched page within three seconds, with nothing said on the console; and what another hand
// puts on that page is not run.
func TestWatchedPageInBrowser(t *testing.T) {
	chromium := browser(t)
	path := filepath.Join(t.TempDir(), "ringbook.db")
	logbookOf(t, path, 1)
	address := "http://" + watching(t, "history", "--logbook", path) + "/"
	x := open(t, chromium, address)
	shows := func(text string, within time.Duration) bool {
		for deadline := time.Now().Add(within); time.Now().Before(deadline); time.Sleep(10 * time.Millisecond) {
			if strings.Contains(eval[string](x, "document.body.innerText"), text) {
				return true
			}
		}
		return false
	}
	if !shows("trial number 0", within) {
		t.Fatal("the page does not come")
	}
	lb, err := store.Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	for i := 1; i <= 3; i++ {
		trial := watchedTrial(i)
		trial.Network = snubber.Network{Kind: snubber.C, C: float64(i) * 100e-12}
		trial.Note += hostileText(" ")
		if _, err := lb.Add(t.Context(), trial); err != nil {
			t.Fatal(err)
		}
		if !shows(squeezed(strings.ReplaceAll(trial.Note, "\u202e", `\u202e`)), 3*time.Second) {
			t.Errorf("trial %d is not on the page after three seconds", i)
		}
	}
	for _, width := range []int64{360, 1280} {
		x.size(width)
		x.finds("overflow", "watched")
	}
	x.finds("structure", "watched")
	said, requests := x.heard()
	for _, s := range said {
		t.Error(s)
	}
	for _, r := range requests {
		if !strings.HasPrefix(r, address) && !strings.HasPrefix(r, "data:") { // the icon that is none
			t.Errorf("the page asks for %s", r)
		}
	}

	for kind, script := range map[string]string{
		"a script":      "const e = document.createElement('script'); e.textContent = 'window.pwned = 1'; document.body.append(e)",
		"a handler":     "const e = document.createElement('p'); e.setAttribute('onclick', 'window.pwned = 1'); document.body.append(e); e.click()",
		"an address":    "const e = document.createElement('a'); e.href = 'javascript:window.pwned = 1'; document.body.append(e); e.click()",
		"another frame": "const e = document.createElement('iframe'); e.srcdoc = '<script>parent.pwned = 1</' + 'script>'; document.body.append(e)",
	} {
		eval[bool](x, "{"+script+"}; true")
		time.Sleep(100 * time.Millisecond) // addresses and frames are opened later
		if eval[bool](x, "'pwned' in window") {
			t.Fatalf("%s put on the page was run", kind)
		}
		if said, _ := x.heard(); !strings.Contains(strings.Join(said, "\n"), "Content Security Policy") {
			t.Errorf("%s put on the page: no policy refuses it: %q", kind, said)
		}
	}
}
