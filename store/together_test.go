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

// TestEverythingAtOnce has two processes log, one of them waveforms, while here trials are logged, struck and decided on,
// boards corrected, another logbook merged, an import run, the logbook read, searched, audited and backed up, and a page
// watches. None is told that the logbook is locked, nothing is lost, and the audits find nothing.
func TestEverythingAtOnce(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	reader, err := OpenReadOnly(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer reader.Close()
	other := bench(t, 300)
	dir := t.TempDir()

	var mu sync.Mutex
	acknowledged := map[string]bool{}
	keep := func(id string) {
		mu.Lock()
		defer mu.Unlock()
		acknowledged[id] = true
	}
	var longest time.Duration
	ctx, stop := context.WithCancel(t.Context())
	defer stop()
	const each = 25
	var writers, others sync.WaitGroup
	for _, work := range []string{strconv.Itoa(each), strconv.Itoa(each) + " with waveforms"} {
		writers.Go(func() {
			cmd, lines := startChild(t, path, work)
			lines.Scan() // ready
			for lines.Scan() {
				keep(lines.Text())
			}
			if err := cmd.Wait(); err != nil {
				t.Error("a child failed:", err)
			}
		})
	}
	write := func(n int, do func(i int) error) {
		writers.Go(func() {
			for i := range n {
				start := time.Now()
				if err := do(i); err != nil {
					t.Error(err)
				}
				mu.Lock()
				longest = max(longest, time.Since(start))
				mu.Unlock()
			}
		})
	}
	write(each, func(i int) error {
		id, err := lb.Add(ctx, example())
		if err != nil {
			return err
		}
		keep(id)
		trial, err := lb.Trial(ctx, id)
		if err != nil {
			return err
		}
		if i%2 == 0 {
			return lb.Strike(ctx, id, "the clip slipped")
		}
		_, err = lb.AddDecision(ctx, decided(trial))
		return err
	})
	write(each, func(i int) error {
		return lb.CorrectBoard(ctx, Board{Name: "Kestrel", DeviceV: float64(80 + i), Revisions: []Revision{{Name: "B", Note: strconv.Itoa(i)}}})
	})
	write(3, func(i int) error {
		_, err := lb.Merge(ctx, other.Path(), nil)
		return err
	})
	write(3, func(i int) error {
		_, err := lb.AddAll(ctx, many(400), nil)
		return err
	})
	write(3, func(i int) error {
		r, err := reader.Backup(ctx, filepath.Join(dir, strconv.Itoa(i)+".db"))
		if err == nil && !r.Sound() {
			t.Error(r.Damage)
		}
		return err
	})
	again := func(do func() error) {
		others.Go(func() {
			for ctx.Err() == nil {
				if err := do(); err != nil && !errors.Is(err, context.Canceled) {
					t.Error(err)
					return
				}
			}
		})
	}
	last := 0
	again(func() error {
		n := 0
		for _, err := range reader.Search(ctx, Query{Words: "drawer", Scope: Scope{IncludeStruck: true}}) {
			if err != nil {
				return err
			}
			n++
		}
		if n < last {
			t.Errorf("%d found after %d", n, last)
		}
		last = n
		return nil
	})
	again(func() error {
		r, err := reader.Audit(ctx, nil)
		if err == nil && !r.Sound() {
			t.Error(r.Damage)
		}
		return err
	})
	monitor, err := reader.Monitor(ctx)
	if err != nil {
		t.Fatal(err)
	}
	defer monitor.Close()
	changes := 0
	again(func() error {
		changed, err := monitor.Changed(ctx)
		if changed {
			changes++
		}
		time.Sleep(time.Millisecond)
		return err
	})
	writers.Wait()
	stop()
	others.Wait()

	r := mustAudit(t, lb)
	if want := 3*each + 3*400 + 306; r.Trials != want {
		t.Errorf("%d trials, want %d", r.Trials, want)
	}
	for _, trial := range collect(t, lb, Scope{IncludeStruck: true}) {
		delete(acknowledged, trial.ID)
	}
	if len(acknowledged) != 0 {
		t.Errorf("acknowledged and lost: %v", acknowledged)
	}
	if changes == 0 {
		t.Error("the page saw no change")
	}
	t.Logf("the longest write took %v; the page saw %d changes", longest, changes)
}
