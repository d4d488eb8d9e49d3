package store

import (
	"context"
	"database/sql"
	"errors"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"
)

func TestOpenTogether(t *testing.T) {
	for range 5 {
		path := filepath.Join(t.TempDir(), "ringbook.db")
		var all sync.WaitGroup
		for range 6 {
			all.Go(func() {
				lb, err := Open(t.Context(), path)
				if err != nil {
					t.Error(err)
					return
				}
				defer lb.Close()
				if _, err := lb.Add(t.Context(), example()); err != nil {
					t.Error(err)
				}
			})
		}
		all.Wait()
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		if n := len(collect(t, lb, Scope{})); n != 6 {
			t.Errorf("%d trials, want 6", n)
		}
		lb.Close()
	}
}

func TestLockedTooLong(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	lb, err := open(t.Context(), path, 50*time.Millisecond)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	other, err := sql.Open("sqlite", path)
	if err != nil {
		t.Fatal(err)
	}
	defer other.Close()
	conn, err := other.Conn(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close()
	if _, err := conn.ExecContext(t.Context(), "BEGIN IMMEDIATE"); err != nil {
		t.Fatal(err)
	}
	if _, err := lb.Add(t.Context(), example()); !errors.Is(err, ErrBusy) || !strings.Contains(err.Error(), "another program") {
		t.Errorf("Add while another writes: %v", err)
	}
	// With the whole ten seconds to wait, the end of the context ends the wait.
	patient, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer patient.Close()
	ctx, cancel := context.WithTimeout(t.Context(), 50*time.Millisecond)
	defer cancel()
	start := time.Now()
	if _, err := patient.Add(ctx, example()); !errors.Is(err, context.DeadlineExceeded) || time.Since(start) > 5*time.Second {
		t.Errorf("Add with a deadline of 50 ms: %v after %v", err, time.Since(start))
	}
	if _, err := conn.ExecContext(t.Context(), "ROLLBACK"); err != nil {
		t.Fatal(err)
	}
	mustAdd(t, patient, example())
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

// TestWaveformsFromTwoProgramsAtOnce has another process log waveforms while this one does, and each sees its own.
func TestWaveformsFromTwoProgramsAtOnce(t *testing.T) {
	lb := openTemp(t)
	const each = 20
	var ids []string
	cmd, lines := startChild(t, lb.Path(), strconv.Itoa(each)+" with waveforms")
	lines.Scan() // ready
	for range each {
		id, _ := mustAddWithWaveforms(t, lb)
		ids = append(ids, id)
	}
	for lines.Scan() {
		ids = append(ids, lines.Text())
	}
	if err := cmd.Wait(); err != nil {
		t.Fatal("the child failed:", err)
	}
	_, want := withWaveforms()
	seen := map[string]bool{}
	for _, id := range ids {
		for i, w := range waveforms(t, lb, id) {
			if w.TrialID != id || !slices.Equal(w.Volts, want[i].Volts) {
				t.Errorf("waveform %s of trial %s is another", w.ID, id)
			}
			seen[w.ID] = true
		}
	}
	if len(ids) != 2*each || len(seen) != 4*each {
		t.Errorf("%d trials with %d waveforms, want %d with %d", len(ids), len(seen), 2*each, 4*each)
	}
}

// TestReadersLeaveNothing has readers come and go beside each other and beside a writer.
func TestReadersLeaveNothing(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "ringbook.db")
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	mustAdd(t, lb, example())
	var readers sync.WaitGroup
	for range 4 {
		readers.Go(func() {
			for range 10 {
				r, err := OpenReadOnly(t.Context(), path)
				if err != nil {
					t.Error(err)
					return
				}
				if _, err := r.db.ExecContext(t.Context(), "INSERT INTO board (name) VALUES ('x')"); err == nil {
					t.Error("a logbook open for reading alone was written to")
				}
				if n := len(collect(t, r, Scope{})); n == 0 {
					t.Error("no trials")
				}
				if err := r.Close(); err != nil {
					t.Error(err)
				}
			}
		})
	}
	for range 50 {
		mustAdd(t, lb, example())
	}
	if err := lb.Close(); err != nil {
		t.Error(err)
	}
	readers.Wait()
	if names, _ := filepath.Glob(filepath.Join(dir, "*")); len(names) != 1 {
		t.Errorf("left beside the logbook: %v", names)
	}
	r, err := OpenReadOnly(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	if n := len(collect(t, r, Scope{})); n != 51 {
		t.Errorf("%d trials, want 51", n)
	}
}

// TestProgramsComeAndGo has processes open, read or write, and close again beside each other: none finds fault with a file
// that another is just changing, and nothing stays beside it.
func TestProgramsComeAndGo(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "ringbook.db")
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	mustAdd(t, lb, example())
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	var programs sync.WaitGroup
	for _, work := range []string{"read", "read", "read", "3 with waveforms"} {
		programs.Go(func() {
			for range rounds(t, 15) {
				cmd, lines := startChild(t, path, work)
				for lines.Scan() {
				}
				if err := cmd.Wait(); err != nil {
					t.Errorf("%s: %v", work, err)
				}
			}
		})
	}
	programs.Wait()
	if names, _ := filepath.Glob(filepath.Join(dir, "*")); len(names) != 1 {
		t.Errorf("left beside the logbook: %v", names)
	}
}
