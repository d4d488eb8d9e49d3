package store

import (
	"context"
	"database/sql"
	"errors"
	"path/filepath"
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
