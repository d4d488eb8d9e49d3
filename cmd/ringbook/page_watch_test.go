package main

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
	"time"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/store"
)

// within is far longer than anything here takes, and ends a test that hangs.
const within = 20 * time.Second

// watching runs `ringbook page RECIPE --watch` and gives the address. At the test's end it is interrupted, has to end in
// order, and has to leave no goroutine behind.
func watching(t *testing.T, recipe string, args ...string) (address string) {
	t.Helper()
	before := runtime.NumGoroutine()
	ctx, interrupt := context.WithCancel(t.Context())
	out, in := io.Pipe()
	ended := make(chan error, 1)
	go func() {
		err := run(ctx, append([]string{"page", recipe, "--watch", "--quiet"}, args...), strings.NewReader(""), in, io.Discard)
		in.CloseWithError(errors.Join(io.EOF, err))
		ended <- err
	}()
	t.Cleanup(func() {
		interrupt()
		select {
		case err := <-ended:
			if err != nil {
				t.Errorf("interrupted: %v", err)
			}
		case <-time.After(within):
			t.Fatal("the interrupt does not end it")
		}
		http.DefaultClient.CloseIdleConnections()
		for deadline := time.Now().Add(within); runtime.NumGoroutine() > before; time.Sleep(10 * time.Millisecond) {
			if time.Now().After(deadline) {
				stacks := make([]byte, 1<<20)
				t.Fatalf("%d goroutines before, %d after:\n%s", before, runtime.NumGoroutine(), stacks[:runtime.Stack(stacks, true)])
			}
		}
	})
	line, err := bufio.NewReader(out).ReadString('\n')
	if err != nil {
		t.Fatal(err)
	}
	address = strings.TrimSuffix(strings.TrimPrefix(line, "The page is at http://"), "/\n")
	if _, _, err := net.SplitHostPort(address); err != nil {
		t.Fatalf("it says %q", line)
	}
	return address
}

// logbookOf makes a logbook with so many trials.
func logbookOf(t *testing.T, path string, trials int) {
	t.Helper()
	lb, err := store.Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	for i := range trials {
		if _, err := lb.Add(t.Context(), watchedTrial(i)); err != nil {
			t.Fatal(err)
		}
	}
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
}

func watchedTrial(i int) snubber.Trial {
	return snubber.Trial{
		Board: "winch-drive", Revision: "B", Network: snubber.Network{Kind: snubber.Bare}, Note: fmt.Sprintf("trial number %d", i),
		At: time.Date(2026, 3, 1, 9, i, 0, 0, time.UTC), Readings: []snubber.Reading{{Quantity: snubber.RingHz, Value: 88e6, U: 1e5}},
	}
}

// get gives the page.
func get(t *testing.T, address string) string {
	t.Helper()
	r, err := http.Get("http://" + address + "/")
	if err != nil {
		t.Fatal(err)
	}
	defer r.Body.Close()
	text, err := io.ReadAll(r.Body)
	if err != nil || r.StatusCode != http.StatusOK {
		t.Fatalf("%s, %v", r.Status, err)
	}
	return string(text)
}

// events are the versions that a browser is told of, the first at once.
func events(t *testing.T, address string) <-chan string {
	t.Helper()
	r, err := http.NewRequestWithContext(t.Context(), http.MethodGet, "http://"+address+"/events", nil)
	if err != nil {
		t.Fatal(err)
	}
	answer, err := http.DefaultClient.Do(r)
	if err != nil {
		t.Fatal(err)
	}
	if answer.StatusCode != http.StatusOK || answer.Header.Get("Content-Type") != "text/event-stream" {
		t.Fatalf("%s, %v", answer.Status, answer.Header)
	}
	t.Cleanup(func() { answer.Body.Close() })
	told := make(chan string, 100)
	go func() {
		defer close(told)
		for lines := bufio.NewScanner(answer.Body); lines.Scan(); {
			if version, ok := strings.CutPrefix(lines.Text(), "data: "); ok {
				told <- version
			}
		}
	}()
	return told
}

// until waits for events until the page has a text, and gives it.
func until(t *testing.T, address string, told <-chan string, text string) string {
	t.Helper()
	timeout := time.After(within)
	for {
		if page := get(t, address); strings.Contains(page, text) {
			return page
		}
		select {
		case _, open := <-told:
			if !open {
				t.Fatal("the stream of events ended")
			}
		case <-timeout:
			t.Fatalf("the page has no %q: %s", text, get(t, address))
		}
	}
}

// What another program logs arrives, and what it strikes.
func TestWatchAnotherProgram(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	logbookOf(t, path, 1)
	program := filepath.Join(t.TempDir(), "ringbook") // TestMain knows it by this name
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink(self, program); err != nil {
		t.Skip(err)
	}
	address := watching(t, "history", "--logbook", path)
	told := events(t, address)
	page := until(t, address, told, "trial number 0")
	for i := 1; i < 4; i++ {
		note := fmt.Sprintf("logged elsewhere, %d", i)
		if strings.Contains(page, note) {
			t.Fatalf("%q is on the page before it is logged", note)
		}
		enter := exec.CommandContext(t.Context(), program, "trial", "enter", "--logbook", path, "--board", "winch-drive", "--revision", "B",
			"--network", "bare", "--ring-hz", "88MHz", "--note", note)
		if out, err := enter.CombinedOutput(); err != nil {
			t.Fatalf("%v: %s", err, out)
		}
		page = until(t, address, told, note)
	}
}

// A logbook that is not there yet, holds nothing, is moved away or cannot be read: the page says so, and goes on.
func TestWatchThroughTrouble(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	address := watching(t, "history", "--logbook", path)
	told := events(t, address)
	until(t, address, told, "there is no logbook in that place")
	logbookOf(t, path, 0)
	until(t, address, told, "holds no trial; log one with")
	logbookOf(t, path, 2)
	until(t, address, told, "trial number 1")
	away := path + ".away"
	if err := os.Rename(path, away); err != nil {
		t.Skip(err) // Windows moves no open file
	}
	page := until(t, address, told, "there is no logbook in that place")
	if strings.Contains(page, "trial number") {
		t.Error("old trials stand beside the error")
	}
	if err := os.WriteFile(path, []byte(strings.Repeat("this is no logbook ", 100)), 0o600); err != nil {
		t.Fatal(err)
	}
	until(t, address, told, "it is not an SQLite file")
	if err := os.Rename(away, path); err != nil {
		t.Fatal(err)
	}
	until(t, address, told, "trial number 1")
	logbookOf(t, path, 3)
	until(t, address, told, "trial number 2")
}

// A page is woven once for each change, and not while nothing changes.
func TestWatchWeavesOnChange(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	logbookOf(t, path, 1)
	weaves := make(chan int, 1000)
	counted := recipes.Recipe{Title: "Counted", Weave: func(ctx context.Context, p *page.Page, src recipes.Source) error {
		trials, err := src.Trials(ctx)
		weaves <- len(trials)
		return err
	}}
	ctx, stop := context.WithCancel(t.Context())
	ended := make(chan error, 1)
	a := &app{logbook: path, stdout: io.Discard, stderr: io.Discard}
	go func() { ended <- a.follow(ctx, weaving{recipe: counted, flags: &scopeFlags{}}, newSite("127.0.0.1:1")) }()
	next := func(want int) { // or the one after: opening a logbook may tidy its file
		t.Helper()
		for timeout := time.After(within); ; {
			select {
			case got := <-weaves:
				if got == want {
					return
				}
			case <-timeout:
				t.Fatalf("it is not woven of %d trials", want)
			}
		}
	}
	next(1)
	time.Sleep(5 * watchEvery)
	if len(weaves) > 0 {
		t.Errorf("woven %d times more though nothing changed", len(weaves))
	}
	lb, err := store.Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	if _, err := lb.Add(t.Context(), watchedTrial(1)); err != nil {
		t.Fatal(err)
	}
	next(2)
	stop()
	if err := <-ended; err != nil {
		t.Error(err)
	}
}

func TestListenLoopback(t *testing.T) {
	for _, bad := range []string{"", "8023", ":8023", "0.0.0.0:0", "[::]:0", "192.0.2.1:0", "example.invalid:0", "127.0.0.1.example.invalid:0", "[::ffff:192.0.2.1]:0", "127.0.0.1"} {
		l, err := listenLoopback(t.Context(), bad)
		var usage *usageError
		if !errors.As(err, &usage) {
			t.Errorf("--listen %q: %v", bad, err)
		}
		if l != nil {
			l.Close()
		}
	}
	for _, good := range []string{"127.0.0.1:0", "localhost:0", "127.0.0.7:0"} {
		l, err := listenLoopback(t.Context(), good)
		if err != nil {
			t.Errorf("--listen %q: %v", good, err)
			continue
		}
		if _, err := listenLoopback(t.Context(), l.Addr().String()); err == nil || !strings.Contains(err.Error(), "in use") {
			t.Errorf("a port that is taken: %v", err)
		}
		l.Close()
	}
}
