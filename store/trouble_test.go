package store

import (
	"bytes"
	"context"
	"errors"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ringbook/snubber"
)

// TestDiskFull lets SQLite's own bound on the file's size stand for the disk's.
func TestDiskFull(t *testing.T) {
	lb := openTemp(t)
	mustAdd(t, lb, example())
	bound := func(pages string) {
		w := <-lb.turn
		if _, err := w.conn.ExecContext(t.Context(), "PRAGMA max_page_count = "+pages); err != nil {
			t.Error(err)
		}
		lb.turn <- w
	}
	bound("1") // the least SQLite allows: as many as there are
	n, err := lb.AddAll(t.Context(), many(1000), nil)
	if n != 0 || !errors.Is(err, ErrFull) || !strings.Contains(err.Error(), "make room") {
		t.Errorf("AddAll on a full disk: %d, %v", n, err)
	}
	if n := len(collect(t, lb, Scope{})); n != 1 {
		t.Errorf("%d trials, want 1", n)
	}
	bound("1000000")
	mustAdd(t, lb, example())
}

// TestDamagedRows overwrites the pages behind the schema: the file opens, and reading it says so.
func TestDamagedRows(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := lb.AddAll(t.Context(), many(2000), nil); err != nil {
		t.Fatal(err)
	}
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	copy(data[len(data)/2:], bytes.Repeat([]byte{0xA5}, len(data)))
	if err := os.WriteFile(path, data, 0o644); err != nil {
		t.Fatal(err)
	}
	lb, err = Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	n := 0
	var last error
	for _, err := range lb.Trials(t.Context(), Scope{}) {
		n++
		last = err
	}
	if !errors.Is(last, ErrDamaged) || !strings.Contains(last.Error(), "backup") {
		t.Errorf("after %d trials: %v", n, last)
	}
}

// TestFlippedBytes changes a few bytes anywhere: whatever comes back, it comes back as an error or as trials.
func TestFlippedBytes(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "ringbook.db")
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := lb.AddAll(t.Context(), many(100), nil); err != nil {
		t.Fatal(err)
	}
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	sound, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	failed := 0
	n := rounds(t, 40)
	for i := range n {
		random := rand.New(rand.NewPCG(uint64(i), 1))
		data := bytes.Clone(sound)
		for range 1 + random.IntN(20) {
			data[random.IntN(len(data))] ^= byte(1 + random.IntN(255))
		}
		flipped := filepath.Join(dir, "flipped.db")
		if err := os.WriteFile(flipped, data, 0o644); err != nil {
			t.Fatal(err)
		}
		if !usable(t.Context(), flipped) {
			failed++
		}
		os.Remove(flipped + "-wal")
		os.Remove(flipped + "-shm")
	}
	t.Logf("%d of %d damaged files refused something", failed, n)
}

// usable opens, reads, writes and strikes.
func usable(ctx context.Context, path string) bool {
	lb, err := Open(ctx, path)
	if err != nil {
		return false
	}
	defer lb.Close()
	for _, err := range lb.Trials(ctx, Scope{IncludeStruck: true}) {
		if err != nil {
			return false
		}
	}
	id, err := lb.Add(ctx, example())
	if err != nil {
		return false
	}
	_, err = lb.Boards(ctx)
	return err == nil && lb.Strike(ctx, id, "damaged file") == nil
}

func TestAddAllStopsWhenAsked(t *testing.T) {
	lb := openTemp(t)
	ctx, cancel := context.WithCancel(t.Context())
	var told []int
	n, err := lb.AddAll(ctx, many(5000), func(n int) {
		if told = append(told, n); n == 3000 {
			cancel()
		}
	})
	if n != 0 || !errors.Is(err, context.Canceled) || len(told) != 3 || told[0] != 1000 {
		t.Errorf("%d, %v, progress %v", n, err, told)
	}
	if n := len(collect(t, lb, Scope{})); n != 0 {
		t.Errorf("%d trials logged", n)
	}
	if n, err := lb.AddAll(t.Context(), many(2), nil); n != 2 || err != nil {
		t.Errorf("afterwards: %d, %v", n, err)
	}
}

func TestAPanicInTheSequenceLeavesTheLogbookUsable(t *testing.T) {
	lb := openTemp(t)
	func() {
		defer func() {
			if recover() == nil {
				t.Error("the panic was swallowed")
			}
		}()
		lb.AddAll(t.Context(), func(yield func(snubber.Trial, error) bool) {
			yield(example(), nil)
			panic("the caller's own fault")
		}, nil)
	}()
	mustAdd(t, lb, example())
	if n := len(collect(t, lb, Scope{})); n != 1 {
		t.Errorf("%d trials, want 1", n)
	}
}

func TestUseAfterClose(t *testing.T) {
	lb := openTemp(t)
	if err := errors.Join(lb.Close(), lb.Close()); err != nil {
		t.Fatal(err)
	}
	if _, err := lb.Add(t.Context(), example()); err == nil || !strings.Contains(err.Error(), "closed") {
		t.Errorf("Add: %v", err)
	}
	for _, err := range lb.Trials(t.Context(), Scope{}) {
		if err == nil || !strings.Contains(err.Error(), "closed") {
			t.Errorf("Trials: %v", err)
		}
	}
}
