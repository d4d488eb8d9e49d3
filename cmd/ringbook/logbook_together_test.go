package main

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
)

// programOf gives a path by which this test's binary is the program.
func programOf(t *testing.T) string {
	t.Helper()
	program := filepath.Join(t.TempDir(), "ringbook") // TestMain knows it by this name
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink(self, program); err != nil {
		t.Skip(err)
	}
	return program
}

// Two programs log to one file, one of them a long import between, another copies, exports and audits it, a fourth reads and a page is
// watched: nobody is told that it is locked, and every trial that was acknowledged is there.
func TestSeveralProgramsAtOnce(t *testing.T) {
	const each = 20
	program := programOf(t)
	dir := filepath.Join(t.TempDir(), "Prüfstand 3 – 記録")
	if err := os.Mkdir(dir, 0o700); err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(dir, "log book.db")
	logbookOf(t, path, 1)
	rows := filepath.Join(dir, "rows.csv")
	const imported = 500 // an import has the logbook for itself, and others wait ten seconds: far longer than this one takes
	f, err := os.Create(rows)
	if err != nil {
		t.Fatal(err)
	}
	if err := writeRows(f, imported); err != nil {
		t.Fatal(err)
	}
	if err := f.Close(); err != nil {
		t.Fatal(err)
	}
	// call runs the program, which has to succeed and to say nothing of locks.
	call := func(ctx context.Context, args ...string) []byte {
		var out, said bytes.Buffer
		cmd := exec.CommandContext(ctx, program, append(args, "--logbook", path)...)
		cmd.Stdout, cmd.Stderr = &out, &said
		if err := cmd.Run(); err != nil && ctx.Err() == nil {
			t.Errorf("ringbook %s: %v: %s", strings.Join(args, " "), err, &said)
		}
		if s := said.String(); strings.Contains(s, "lock") || strings.Contains(s, "busy") {
			t.Errorf("ringbook %s: %s", strings.Join(args, " "), s)
		}
		return out.Bytes()
	}

	watch := exec.CommandContext(t.Context(), program, "page", "history", "--watch", "--quiet", "--board", "winch-drive", "--revision", "B", "--logbook", path)
	watchedOut, err := watch.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := watch.Start(); err != nil {
		t.Fatal(err)
	}
	defer func() {
		_ = watch.Process.Signal(os.Interrupt)
		if err := watch.Wait(); err != nil {
			t.Errorf("the page: %v", err)
		}
	}()
	line, err := bufio.NewReader(watchedOut).ReadString('\n')
	if err != nil {
		t.Fatal(err)
	}
	address := strings.TrimSuffix(strings.TrimPrefix(line, "The page is at http://"), "/\n")
	told := events(t, address)

	var mu sync.Mutex
	ids := map[string]bool{}
	var writers, others sync.WaitGroup
	for w := range 2 {
		writers.Go(func() {
			for i := range each {
				var logged struct{ ID string }
				out := call(t.Context(), "trial", "enter", "--json", "--board", "winch-drive", "--revision", "B", "--network", "bare", "--ring-hz", "88MHz",
					"--note", fmt.Sprintf("writer %d trial %d", w, i))
				if err := json.Unmarshal(out, &logged); err != nil {
					t.Errorf("%v in %q", err, out)
					continue // it was not acknowledged
				}
				mu.Lock()
				ids[logged.ID] = true
				mu.Unlock()
				if w == 0 && i == each/2 {
					call(t.Context(), "trial", "import", rows)
				}
			}
		})
	}
	ctx, stop := context.WithCancel(t.Context())
	defer stop()
	others.Go(func() {
		for last := 0; ctx.Err() == nil; {
			var all struct{ Trials []struct{ ID string } }
			out := call(ctx, "history", "--json", "--limit", "0")
			if ctx.Err() != nil {
				return
			}
			if err := json.Unmarshal(out, &all); err != nil || len(all.Trials) < last {
				t.Errorf("%d trials after %d (%v)", len(all.Trials), last, err)
			}
			last = len(all.Trials)
		}
	})
	others.Go(func() {
		for i := 0; ctx.Err() == nil; i++ {
			call(ctx, "logbook", "backup", filepath.Join(dir, fmt.Sprintf("copy %d.db", i)))
			call(ctx, "logbook", "export", "-o", filepath.Join(dir, fmt.Sprintf("copy %d.jsonl", i)))
			call(ctx, "logbook", "audit", "--quiet")
		}
	})
	writers.Wait()
	stop()
	others.Wait()
	for w := range 2 {
		until(t, address, told, fmt.Sprintf("writer %d trial %d", w, each-1))
	}
	var all struct{ Trials []struct{ ID string } }
	if err := json.Unmarshal(call(t.Context(), "history", "--json", "--limit", "0"), &all); err != nil {
		t.Fatal(err)
	}
	if want := 1 + 2*each + imported; len(all.Trials) != want {
		t.Errorf("%d trials, want %d", len(all.Trials), want)
	}
	for _, x := range all.Trials {
		delete(ids, x.ID)
	}
	if len(ids) > 0 {
		t.Errorf("%d acknowledged trials are lost", len(ids))
	}
	if out := call(t.Context(), "logbook", "audit"); !bytes.Contains(out, []byte(" is sound: ")) {
		t.Errorf("%s", out)
	}
}
