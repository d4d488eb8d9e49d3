package main

import (
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"ringbook/store"

	"github.com/chromedp/chromedp"
)

// screenshots names a folder for pictures of the page as the trials arrive, for a person to look at.
const screenshots = "RINGBOOK_SCREENSHOTS"

// TestWatchInABrowser looks at the page of a substitution series in Chromium while trials arrive: the fit converges on the
// screen, what was unfolded stays so, nothing is complained of, and nothing is asked of any other place.
func TestWatchInABrowser(t *testing.T) {
	chromium, err := exec.LookPath("chromium")
	if err != nil {
		if os.Getenv("RINGBOOK_CHECKS") == "all" {
			t.Fatal(err)
		}
		t.Skip(err)
	}
	path := filepath.Join(t.TempDir(), "ringbook.db")
	address := watching(t, "substitution", "--logbook", path)
	ctx, cancel := context.WithTimeout(t.Context(), 2*time.Minute)
	defer cancel()
	ctx, cancel = chromedp.NewExecAllocator(ctx, append(chromedp.DefaultExecAllocatorOptions[:],
		chromedp.ExecPath(chromium), chromedp.NoSandbox, chromedp.UserDataDir(t.TempDir()), chromedp.WindowSize(1000, 1400))...)
	defer cancel()
	ctx, cancel = chromedp.NewContext(ctx)
	defer cancel()
	complaints := chromedp.Console(ctx)
	look := func(script string) string {
		t.Helper()
		said, err := chromedp.Run(ctx, chromedp.Evaluate[string](script))
		if err != nil {
			t.Fatal(err)
		}
		return said
	}
	see := func(what, text string) {
		t.Helper()
		for deadline := time.Now().Add(within); !strings.Contains(look("document.body.innerText"), text); time.Sleep(20 * time.Millisecond) {
			if time.Now().After(deadline) {
				t.Fatalf("%s: no %q on the page: %s", what, text, look("document.body.innerText"))
			}
		}
	}
	shot := func(name string) {
		dir := os.Getenv(screenshots)
		if dir == "" {
			return
		}
		png, err := chromedp.Run(ctx, chromedp.FullScreenshot(100))
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(dir, name+".png"), png, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	if err := chromedp.Do(ctx, chromedp.Navigate("http://"+address+"/")); err != nil {
		t.Fatal(err)
	}
	see("before the first trial", "there is no logbook in that place")
	shot("0")

	series, err := os.Open("testdata/peaks.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer series.Close()
	lb, err := store.Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	n := 0
	for trial, err := range store.ReadCSV(series) {
		if err != nil {
			t.Fatal(err)
		}
		id, err := lb.Add(t.Context(), trial)
		if err != nil {
			t.Fatal(err)
		}
		n++
		see(fmt.Sprintf("after trial %d", n), store.ShortID(id))
		shot(fmt.Sprint(n))
		if n == 2 {
			look("document.querySelector('summary').click(), ''")
		}
	}
	see("at the end", "loop inductance L\t13.")
	if look("String(document.querySelector('details').open)") != "true" {
		t.Error("what was unfolded is folded again")
	}
	if title := look("document.title"); title != "Loop of winch-drive B" {
		t.Errorf("the title is %q", title)
	}
	for from := range strings.FieldsSeq(look("performance.getEntriesByType('resource').map((e) => e.name).join(' ')")) {
		if !strings.HasPrefix(from, "http://"+address+"/") {
			t.Errorf("it asked for %s", from)
		}
	}
	// To ask another address is refused by the page's policy, which says so: the one complaint there is to be.
	look("fetch('http://127.0.0.1:9/').catch(() => 0), ''")
	for m, err := range complaints {
		if err != nil {
			t.Fatal(err)
		}
		if strings.Contains(m.Text, "http://127.0.0.1:9/") && strings.Contains(m.Text, "Content Security Policy") {
			break
		}
		t.Error(m)
	}

	// A page whose program has ended says so.
	t.Run("ended", func(t *testing.T) {
		if err := chromedp.Do(ctx, chromedp.Navigate("http://"+watching(t, "substitution", "--logbook", path)+"/")); err != nil {
			t.Fatal(err)
		}
		see("of another program", "loop inductance L\t13.")
	})
	see("after its end", "does not answer: trials logged since are not on it")
	shot("ended")
}
