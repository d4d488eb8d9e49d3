package store

import (
	"errors"
	"os"
	"path/filepath"
	"testing"
)

// TestMonitor looks for what this Logbook and another one write; the connection that looks writes nothing itself.
func TestMonitor(t *testing.T) {
	ctx := t.Context()
	path := filepath.Join(t.TempDir(), "watched.db")
	ours, err := Open(ctx, path)
	if err != nil {
		t.Fatal(err)
	}
	defer ours.Close()
	other, err := Open(ctx, path)
	if err != nil {
		t.Fatal(err)
	}
	defer other.Close()
	reader, err := OpenReadOnly(ctx, path)
	if err != nil {
		t.Fatal(err)
	}
	defer reader.Close()
	for name, lb := range map[string]*Logbook{"the writer": ours, "a reader": reader} {
		m, err := lb.Monitor(ctx)
		if err != nil {
			t.Fatal(err)
		}
		changed := func(want bool, when string) {
			t.Helper()
			if got, err := m.Changed(ctx); err != nil || got != want {
				t.Errorf("%s, %s: changed %v, %v", name, when, got, err)
			}
		}
		changed(false, "before any write")
		id, err := other.Add(ctx, example())
		if err != nil {
			t.Fatal(err)
		}
		changed(true, "after another logbook's write")
		changed(false, "asked again")
		for range reader.Trials(ctx, Scope{}) {
		}
		changed(false, "after a read")
		if err := ours.Strike(ctx, id, "to see it"); err != nil {
			t.Fatal(err)
		}
		changed(true, "after a strike by the first")
		if err := m.Close(); err != nil {
			t.Error(err)
		}
		if err := m.Close(); err != nil {
			t.Errorf("closed twice: %v", err)
		}
		if _, err := m.Changed(ctx); err == nil {
			t.Error("a closed monitor answers")
		}
	}
}

func TestMonitorOfAReplacedFile(t *testing.T) {
	ctx := t.Context()
	path := filepath.Join(t.TempDir(), "watched.db")
	lb, err := Open(ctx, path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	m, err := lb.Monitor(ctx)
	if err != nil {
		t.Fatal(err)
	}
	defer m.Close()
	if err := os.Rename(path, path+".old"); err != nil {
		t.Skip(err) // Windows moves no open file
	}
	if _, err := m.Changed(ctx); !errors.Is(err, ErrMissing) {
		t.Errorf("moved away: %v", err)
	}
	if err := os.WriteFile(path, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := m.Changed(ctx); !errors.Is(err, ErrMissing) {
		t.Errorf("replaced: %v", err)
	}
}
