package store

import (
	"os"
	"path/filepath"
	"slices"
	"testing"
	"time"
)

// TestClockSetBack logs with a clock that runs backwards: the chain keeps the order of logging, searches the order of time,
// also across stretches of the index.
func TestClockSetBack(t *testing.T) {
	lb := openTemp(t)
	const n = 3000
	now := time.Date(2026, 3, 1, 0, 0, 0, 0, time.UTC)
	var logged []string
	err := lb.write(t.Context(), func(w *writer) error {
		for range n {
			now = now.Add(-time.Minute)
			ids, err := newIDs(2)
			if err != nil {
				return err
			}
			trial := example()
			trial.ID, trial.At = ids[0], now
			seq, err := w.addTrial(t.Context(), &loggedTrial{Trial: trial, loggedAt: now}, nil)
			if err != nil {
				return err
			}
			if len(logged)%10 == 9 { // struck before it was logged, says the clock
				if err := w.addStrike(t.Context(), seq, &loggedStrike{ids[1], ids[0], now.Add(-time.Hour), "clip slipped"}, nil); err != nil {
					return err
				}
			}
			logged = append(logged, ids[0])
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if r := mustAudit(t, lb); r.Trials != n || r.Strikes != n/10 {
		t.Errorf("%+v", r)
	}
	inTime := slices.Clone(logged)
	slices.Reverse(inTime)
	for _, q := range []Query{{}, {Words: "drawer"}, {Words: "drawer", Scope: Scope{Limit: n}}, {Scope: Scope{Limit: n}}} {
		q.IncludeStruck = true
		var got []string
		for _, trial := range found(t, lb, q) {
			got = append(got, trial.ID)
		}
		if !slices.Equal(got, inTime) {
			t.Errorf("%+v: %d found, or in another order than that of time", q, len(got))
		}
	}
	all := openTemp(t)
	mustAdd(t, all, example())
	if m := mustMerge(t, all, lb); m.Trials != n || m.Strikes != n/10 {
		t.Errorf("%+v", m)
	}
	mustAudit(t, all)
}

// TestPlacesOfAnyName merges from and backs up to places with spaces and with letters and signs that a URI would take for its own.
func TestPlacesOfAnyName(t *testing.T) {
	folder := filepath.Join(t.TempDir(), "bench 2, größe 測定 50 % #1")
	if err := os.Mkdir(folder, 0o777); err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(folder, "klüver's log ☕ %41.db")
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	varied(t, lb)
	if r, err := lb.Backup(t.Context(), filepath.Join(folder, "a copy; 'of' it %2F #x.db")); err != nil || r.Head != mustAudit(t, lb).Head {
		t.Errorf("%+v, %v", r, err)
	}
	all := openTemp(t)
	mustMerge(t, all, lb)
	mustAudit(t, all)
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	entries, err := os.ReadDir(folder)
	if err != nil || len(entries) != 2 {
		t.Errorf("the folder holds %v, %v; want the logbook and its copy", entries, err)
	}
}
