package store

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ringbook/snubber"
)

// version1 is a copy of a logbook that the program of schema 1 wrote: a board with two revisions, five trials of one, the
// last of them struck. testdata/version1.sqlite is never made again.
func version1(t *testing.T) string {
	t.Helper()
	data, err := os.ReadFile("testdata/version1.sqlite")
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "ringbook.db")
	put(t, path, data)
	return path
}

func TestVersion1MovesForward(t *testing.T) {
	path := version1(t)
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	var version int
	if err := lb.db.QueryRowContext(t.Context(), "PRAGMA user_version").Scan(&version); err != nil || version != 2 {
		t.Errorf("schema %d, %v; want 2", version, err)
	}
	trials := checkVersion1(t, lb)
	if n := len(decisions(t, lb, Scope{})); n != 0 {
		t.Errorf("%d decisions", n)
	}
	d := decided(trials...)
	d.Board = "mill spindle"
	id := mustDecide(t, lb, d)
	if got, err := lb.Decision(t.Context(), id); err != nil || len(got.Trials) != 4 {
		t.Errorf("decision %v, %v", got, err)
	}
	mustAdd(t, lb, example())
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	again, err := OpenReadOnly(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer again.Close()
	if n := len(decisions(t, again, Scope{})); n != 1 {
		t.Errorf("%d decisions, want 1", n)
	}
}

// Read alone it stays a file of schema 1, and has no decisions.
func TestVersion1IsRead(t *testing.T) {
	path := version1(t)
	before, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	lb, err := OpenReadOnly(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	trials := checkVersion1(t, lb)
	if n := len(decisions(t, lb, Scope{})); n != 0 {
		t.Errorf("%d decisions", n)
	}
	if _, err := lb.Decision(t.Context(), trials[0].ID); err == nil || !strings.Contains(err.Error(), "no such decision") {
		t.Errorf("a decision in it: %v", err)
	}
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	after, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(before, after) {
		t.Error("the file has changed")
	}
}

func checkVersion1(t *testing.T, lb *Logbook) []snubber.Trial {
	t.Helper()
	all := collect(t, lb, Scope{IncludeStruck: true})
	if len(all) != 5 || all[4].Struck != "the ground clip was off" || all[4].Note != "the clip slipped" {
		t.Fatalf("trials %+v", all)
	}
	peak, ok := all[3].Reading(snubber.PeakV)
	if !ok || peak.Value != 77.92 || peak.U != 0.5 || all[3].Network.C != 2.2e-9 || all[3].ProbeC != 3.9e-12 || all[3].Session != "morning" {
		t.Errorf("the fourth trial %+v", all[3])
	}
	ring, _ := all[0].Reading(snubber.RingHz)
	if len(ring.Repeats) != 3 || ring.Instrument != "Larkspur Works,Scope 4,0007,1.2" {
		t.Errorf("the first ring %+v", ring)
	}
	boards, err := lb.Boards(t.Context())
	if err != nil || len(boards) != 1 || boards[0].DeviceV != 100 || len(boards[0].Revisions) != 2 || boards[0].Revisions[1].Trials != 4 {
		t.Errorf("boards %+v, %v", boards, err)
	}
	return all[:4]
}
