package store

import (
	"slices"
	"strings"
	"testing"
	"time"
)

func stretches(t testing.TB, lb *Logbook) []int64 {
	t.Helper()
	all, err := numbers(t.Context(), lb.db, "SELECT last FROM stretch ORDER BY last")
	if err != nil {
		t.Fatal(err)
	}
	return all
}

// TestStretches looks at when the words of trials are indexed: few enough are left for a search to look at as they are.
func TestStretches(t *testing.T) {
	lb := openTemp(t)
	if _, err := lb.AddAll(t.Context(), many(stretchTrials-1), nil); err != nil {
		t.Fatal(err)
	}
	if got := stretches(t, lb); len(got) != 0 {
		t.Errorf("after few trials: %v", got)
	}
	mustAdd(t, lb, example())
	if _, err := lb.AddAll(t.Context(), many(bulkTrials+500), nil); err != nil {
		t.Fatal(err)
	}
	want := []int64{256, 512, 512 + bulkTrials} // and 244 left
	if got := stretches(t, lb); !slices.Equal(got, want) {
		t.Errorf("stretches %v, want %v", got, want)
	}
	if _, err := lb.AddAll(t.Context(), many(300), nil); err != nil {
		t.Fatal(err)
	}
	// One closed as its 12th trial came, and one at the end of the import, of what was left.
	want = append(want, 512+bulkTrials+256, 512+bulkTrials+244+300)
	if got := stretches(t, lb); !slices.Equal(got, want) {
		t.Errorf("stretches %v, want %v", got, want)
	}
	var last, indexed int64
	if err := lb.db.QueryRowContext(t.Context(), "SELECT max(seq), (SELECT max(last) FROM stretch) FROM trial").Scan(&last, &indexed); err != nil || last-indexed >= stretchTrials {
		t.Errorf("%d trials, %d indexed, %v", last, indexed, err)
	}
	long := example()
	long.Note = strings.Repeat("word ", 150_000)
	mustAdd(t, lb, long)
	mustAdd(t, lb, long) // more than stretchBytes
	if got := stretches(t, lb); got[len(got)-1] != last+2 {
		t.Errorf("after long notes: %v, want %d last", got, last+2)
	}
	if lb.Close() != nil {
		t.Fatal("close")
	}
	again, err := Open(t.Context(), lb.Path())
	if err != nil {
		t.Fatal(err)
	}
	defer again.Close()
	mustAdd(t, again, example())
	if got := stretches(t, again); got[len(got)-1] != last+2 {
		t.Errorf("opened anew: %v, want %d last", got, last+2)
	}
	if n, err := again.Count(t.Context(), Query{Words: "drawer"}); err != nil || n != int(last)+3 {
		t.Errorf("%d found, %v; want %d", n, err, last+3)
	}
	mustAudit(t, again)
}

// A clock that was set back makes no correction come before what it corrects.
func TestCorrectionAfterTheClockWasSetBack(t *testing.T) {
	lb := openTemp(t)
	err := lb.write(t.Context(), func(w *writer) error {
		ids, err := newIDs(1)
		if err != nil {
			return err
		}
		return w.addCorrection(t.Context(), &loggedCorrection{id: ids[0], board: "Kestrel", at: time.Now().Add(time.Hour).UTC(), deviceV: 100}, nil)
	})
	if err != nil {
		t.Fatal(err)
	}
	for _, volts := range []float64{80, 90} {
		if err := lb.CorrectBoard(t.Context(), Board{Name: "Kestrel", DeviceV: volts}); err != nil {
			t.Fatal(err)
		}
		if boards, err := lb.Boards(t.Context()); err != nil || boards[0].DeviceV != volts {
			t.Errorf("%+v, %v; want %g V", boards, err, volts)
		}
	}
	mustAudit(t, lb)
}
