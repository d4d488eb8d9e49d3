package store

import (
	"context"
	"errors"
	"iter"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"ringbook/snubber"
)

// openTemp opens a new logbook in a folder of its own.
func openTemp(t testing.TB) *Logbook {
	t.Helper()
	lb, err := Open(t.Context(), filepath.Join(t.TempDir(), "ringbook.db"))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { lb.Close() })
	return lb
}

// example is a trial with five readings, one of them with repeats and an instrument.
func example() snubber.Trial {
	return snubber.Trial{
		Board: "Kestrel", Revision: "B", At: time.Date(2026, 3, 1, 9, 30, 0, 123456789, time.UTC), Session: "morning",
		Network: snubber.Network{Kind: snubber.RC, C: 470e-12, CTol: 0.05, R: 10, RTol: 0.01, ESR: 0.2, MeasuredC: 468e-12, MeasuredU: 1e-12},
		Point:   snubber.OperatingPoint{BusV: 48, CurrentA: 6.5, SwitchingHz: 250e3},
		ProbeC:  9.5e-12,
		Readings: []snubber.Reading{
			{Quantity: snubber.RingHz, Value: 1.8e6, U: 2e3, Repeats: []float64{1.801e6, 1.799e6, 1.8e6}, Instrument: "Larkspur Works,Scope 4,0007,1.2"},
			{Quantity: snubber.DecayS, Value: 0.9e-6, U: 1e-8},
			{Quantity: snubber.PeakV, Value: 71.25},
			{Quantity: snubber.SupplyA, Value: 1.25, Instrument: "Larkspur Works,Supply 2,0011,3.0"},
			{Quantity: snubber.TempC, Value: -4},
		},
		Part: "drawer 3, blue", Note: "first\n\ttry \"quoted\", größer",
	}
}

// many is n trials like example, each with a value of its own.
func many(n int) iter.Seq2[snubber.Trial, error] {
	return func(yield func(snubber.Trial, error) bool) {
		for i := range n {
			trial := example()
			trial.Readings[1].Value = float64(i+1) * 1e-9
			if !yield(trial, nil) {
				return
			}
		}
	}
}

func mustAdd(t testing.TB, lb *Logbook, trial snubber.Trial) string {
	t.Helper()
	id, err := lb.Add(t.Context(), trial)
	if err != nil {
		t.Fatal(err)
	}
	return id
}

func collect(t testing.TB, lb *Logbook, s Scope) []snubber.Trial {
	t.Helper()
	var all []snubber.Trial
	for trial, err := range lb.Trials(t.Context(), s) {
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, trial)
	}
	return all
}

func TestAddThenRead(t *testing.T) {
	lb := openTemp(t)
	want := example()
	want.ID = mustAdd(t, lb, want)
	bare := snubber.Trial{Board: "Kestrel", Revision: "B", At: want.At.Add(-time.Nanosecond), Network: snubber.Network{Kind: snubber.Bare}}
	bare.ID = mustAdd(t, lb, bare)

	if diff := cmp.Diff([]snubber.Trial{bare, want}, collect(t, lb, Scope{})); diff != "" {
		t.Error("as logged, in the order read (-want +got):\n" + diff)
	}
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	again, err := OpenReadOnly(t.Context(), lb.Path())
	if err != nil {
		t.Fatal(err)
	}
	defer again.Close()
	got, err := again.Trial(t.Context(), want.ID)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error("after closing and opening (-want +got):\n" + diff)
	}
	if _, err := again.Add(t.Context(), example()); !errors.Is(err, ErrReadOnly) {
		t.Errorf("Add to a logbook open for reading alone: %v", err)
	}
}

func TestAddDatesWhatHasNoTime(t *testing.T) {
	lb := openTemp(t)
	before := time.Now()
	trial := example()
	trial.At = time.Time{}
	id := mustAdd(t, lb, trial)
	got, err := lb.Trial(t.Context(), id)
	if err != nil || got.At.Before(before) || got.At.After(time.Now()) {
		t.Errorf("at = %v, %v; want the time of logging", got.At, err)
	}
}

func TestScope(t *testing.T) {
	lb := openTemp(t)
	day := func(n int) time.Time { return time.Date(2026, 1, n, 0, 0, 0, 0, time.UTC) }
	for i, br := range []string{"A 1", "A 2", "B 1", "A 1", "B 1"} {
		board, rev, _ := strings.Cut(br, " ")
		trial := snubber.Trial{Board: board, Revision: rev, At: day(i + 1), Network: snubber.Network{Kind: snubber.Bare}, Note: string(rune('a' + i))}
		if i == 3 {
			trial.Struck = "probe fell off"
		}
		mustAdd(t, lb, trial)
	}
	for _, c := range []struct {
		name  string
		scope Scope
		want  string
	}{
		{"all that stands", Scope{}, "abce"},
		{"struck too", Scope{IncludeStruck: true}, "abcde"},
		{"a board", Scope{Board: "A"}, "ab"},
		{"a revision of it", Scope{Board: "A", Revision: "1", IncludeStruck: true}, "ad"},
		{"a revision's name on any board", Scope{Revision: "1"}, "ace"},
		{"since is inclusive, until is not", Scope{Since: day(2), Until: day(5)}, "bc"},
		{"the latest two, oldest first", Scope{Limit: 2}, "ce"},
		{"the latest of a board", Scope{Board: "A", Limit: 1}, "b"},
		{"an unknown board", Scope{Board: "C"}, ""},
		{"a hostile board", Scope{Board: "A' OR 1=1 --"}, ""},
	} {
		got := ""
		for _, trial := range collect(t, lb, c.scope) {
			got += trial.Note
		}
		if got != c.want {
			t.Errorf("%s: trials %q, want %q", c.name, got, c.want)
		}
	}
	revs, err := lb.Revisions(t.Context(), Scope{Since: day(2)})
	if err != nil {
		t.Fatal(err)
	}
	want := []Revision{
		{Board: "A", Name: "2", Trials: 1, First: day(2), Last: day(2)},
		{Board: "B", Name: "1", Trials: 2, First: day(3), Last: day(5)},
	}
	if diff := cmp.Diff(want, revs); diff != "" {
		t.Error("revisions (-want +got):\n" + diff)
	}
}

func TestStopReadingHalfway(t *testing.T) {
	lb := openTemp(t)
	for range 3 {
		mustAdd(t, lb, example())
	}
	for trial, err := range lb.Trials(t.Context(), Scope{}) {
		if err != nil {
			t.Fatal(err)
		}
		mustAdd(t, lb, example()) // a write during a read neither waits nor shows
		_ = trial
		break
	}
	ctx, cancel := context.WithCancel(t.Context())
	defer cancel()
	n := 0
	var last error
	for _, err := range lb.Trials(ctx, Scope{}) {
		n++
		last = err
		cancel()
	}
	if !errors.Is(last, context.Canceled) {
		t.Errorf("after %d trials: %v; want the end of the context", n, last)
	}
	if got := len(collect(t, lb, Scope{})); got != 4 {
		t.Errorf("%d trials, want 4", got)
	}
}
