package store

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"sync"
	"testing"
	"time"
)

// The test binary runs itself again as another program that logs trials until it is killed: these name its file and what
// it does there.
const (
	childFile = "RINGBOOK_TEST_CHILD_FILE"
	childWork = "RINGBOOK_TEST_CHILD_WORK"

	childReady = "ready" // its first line, once it has opened the logbook
)

func TestMain(m *testing.M) {
	if path := os.Getenv(childFile); path != "" {
		if err := child(path, os.Getenv(childWork)); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
		os.Exit(0)
	}
	os.Exit(m.Run())
}

// child prints each id once Add has acknowledged it, or "imported" and a count once AddAll has.
func child(path, work string) error {
	ctx := context.Background()
	if work == "read" {
		return childReads(ctx, path)
	}
	lb, err := Open(ctx, path)
	if err != nil {
		return err
	}
	defer lb.Close()
	if work == "look" {
		return nil
	}
	fmt.Println(childReady)
	if work == "import" {
		for {
			n, err := lb.AddAll(ctx, many(importSize), nil)
			if err != nil {
				return err
			}
			fmt.Println("imported", n)
		}
	}
	n, err := strconv.Atoi(work)
	if err != nil {
		return err
	}
	for range n {
		id, err := lb.Add(ctx, example())
		if err != nil {
			return err
		}
		fmt.Println(id)
	}
	return nil
}

const importSize = 20

func childReads(ctx context.Context, path string) error {
	lb, err := OpenReadOnly(ctx, path)
	if err != nil {
		return err
	}
	defer lb.Close()
	n := 0
	for _, err := range lb.Trials(ctx, Scope{}) {
		if err != nil {
			return err
		}
		n++
	}
	fmt.Println(n, "trials")
	return nil
}

func startChild(t *testing.T, path, work string) (*exec.Cmd, *bufio.Scanner) {
	t.Helper()
	cmd := exec.CommandContext(t.Context(), os.Args[0])
	cmd.Env = append(os.Environ(), childFile+"="+path, childWork+"="+work)
	cmd.Stderr = os.Stderr
	out, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	return cmd, bufio.NewScanner(out)
}

// killSoon waits until the child has the logbook open and has it killed at a random moment after.
func killSoon(cmd *exec.Cmd, lines *bufio.Scanner) {
	lines.Scan()
	time.AfterFunc(time.Duration(rand.IntN(100_000))*time.Microsecond, func() { cmd.Process.Kill() })
}

// rounds is how often a process is killed: RINGBOOK_KILLS, or few enough for an everyday test.
func rounds(t *testing.T, everyday int) int {
	if s := os.Getenv("RINGBOOK_KILLS"); s != "" {
		n, err := strconv.Atoi(s)
		if err != nil {
			t.Fatalf("RINGBOOK_KILLS=%q: %v", s, err)
		}
		return n
	}
	return everyday
}

// TestKilledWhileLogging kills a process that logs, at any moment from its first, and looks for every trial that was
// acknowledged: each must be there, once and whole.
func TestKilledWhileLogging(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	acknowledged := map[string]bool{}
	n := rounds(t, 20)
	for range n {
		cmd, lines := startChild(t, path, "1000000")
		killSoon(cmd, lines)
		for lines.Scan() {
			acknowledged[lines.Text()] = true
		}
		if err := cmd.Wait(); err == nil || cmd.ProcessState.ExitCode() != -1 {
			t.Fatalf("the child was not killed: %v", cmd.ProcessState)
		}
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		found := map[string]int{}
		for trial, err := range lb.Trials(t.Context(), Scope{}) {
			if err != nil {
				t.Fatal(err)
			}
			found[trial.ID]++
			if len(trial.Readings) != 5 || len(trial.Readings[0].Repeats) != 3 {
				t.Fatalf("trial %s is not whole: %v", trial.ID, trial.Readings)
			}
		}
		for id := range acknowledged {
			if found[id] != 1 {
				t.Errorf("trial %s was acknowledged and is there %d times", id, found[id])
			}
		}
		var sound string
		if err := lb.db.QueryRowContext(t.Context(), "PRAGMA integrity_check").Scan(&sound); err != nil || sound != "ok" {
			t.Fatalf("integrity check: %s, %v", sound, err)
		}
		lb.Close()
	}
	if len(acknowledged) == 0 {
		t.Error("no trial was acknowledged in any round: nothing was tested")
	}
	t.Logf("%d rounds, %d trials acknowledged", n, len(acknowledged))
}

// TestKilledWhileImporting finds whole imports alone.
func TestKilledWhileImporting(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	imported := 0
	for range rounds(t, 10) {
		cmd, lines := startChild(t, path, "import")
		killSoon(cmd, lines)
		for lines.Scan() {
			imported += importSize
		}
		cmd.Wait()
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		n := len(collect(t, lb, Scope{}))
		if n%importSize != 0 || n < imported {
			t.Fatalf("%d trials: %d were acknowledged, in imports of %d", n, imported, importSize)
		}
		imported = n
		lb.Close()
	}
	if imported == 0 {
		t.Error("no import was finished in any round: nothing was tested")
	}
}

// TestKilledWhileMaking kills a process that makes a new logbook.
func TestKilledWhileMaking(t *testing.T) {
	for range rounds(t, 20) {
		path := filepath.Join(t.TempDir(), "ringbook.db")
		cmd, _ := startChild(t, path, "look")
		time.AfterFunc(time.Duration(rand.IntN(30_000))*time.Microsecond, func() { cmd.Process.Kill() })
		cmd.Wait()
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		mustAdd(t, lb, example())
		lb.Close()
	}
}

// TestTwoProgramsAtOnce has two processes, and two goroutines here, log to one file while another reads it.
func TestTwoProgramsAtOnce(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	const each = 40
	var mu sync.Mutex
	ids := map[string]bool{}
	keep := func(id string) {
		mu.Lock()
		defer mu.Unlock()
		ids[id] = true
	}
	var writers, readers sync.WaitGroup
	for range 2 {
		writers.Go(func() {
			cmd, lines := startChild(t, path, strconv.Itoa(each))
			lines.Scan() // ready
			for lines.Scan() {
				keep(lines.Text())
			}
			if err := cmd.Wait(); err != nil {
				t.Error("a child failed:", err)
			}
		})
		writers.Go(func() {
			for range each {
				id, err := lb.Add(t.Context(), example())
				if err != nil {
					t.Error(err)
				}
				keep(id)
			}
		})
	}
	ctx, cancel := context.WithCancel(t.Context())
	readers.Go(func() {
		for last := 0; ctx.Err() == nil; {
			n := 0
			for _, err := range lb.Trials(ctx, Scope{}) {
				if err != nil {
					if !errors.Is(err, context.Canceled) {
						t.Error(err)
					}
					return
				}
				n++
			}
			if n < last {
				t.Errorf("a reader saw %d trials after %d", n, last)
			}
			last = n
		}
	})
	writers.Wait()
	cancel()
	readers.Wait()
	for _, trial := range collect(t, lb, Scope{}) {
		delete(ids, trial.ID)
	}
	if n := len(collect(t, lb, Scope{})); n != 4*each || len(ids) != 0 {
		t.Errorf("%d trials, want %d; lost: %v", n, 4*each, ids)
	}
}
