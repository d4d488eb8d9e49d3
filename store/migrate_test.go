package store

import (
	"bytes"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"ringbook/snubber"
)

// version is a copy of a logbook that the program of an older schema wrote; the files in testdata are never made again.
//
//	1  a board with two revisions, five trials of one, the last of them struck
//	2  three trials with five readings each, a decision that rests on them, and the last struck since
//	3  two boards, one with a rating, a note and a revision's note; five trials, the second with two waveforms and readings
//	   from them, struck since; a decision that rests on four
func version(t *testing.T, schema int) string {
	t.Helper()
	data, err := os.ReadFile(fmt.Sprintf("testdata/version%d.sqlite", schema))
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "ringbook.db")
	put(t, path, data)
	return path
}

func TestVersion1MovesForward(t *testing.T) {
	path := version(t, 1)
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	if schema, err := schemaOf(t.Context(), lb.db); err != nil || schema != 4 {
		t.Errorf("schema %d, %v; want 4", schema, err)
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
	path := version(t, 1)
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

func TestVersion2MovesForward(t *testing.T) {
	path := version(t, 2)
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	checkVersion2(t, lb)
	var n int
	err = lb.db.QueryRowContext(t.Context(), "SELECT count(*) FROM trial_table WHERE waveforms = 0 AND from_waveform IS NULL AND ring_hz = 1.8e6").Scan(&n)
	if err != nil || n != 3 {
		t.Errorf("%d trials in the view, %v; want 3", n, err)
	}
	id, want := mustAddWithWaveforms(t, lb)
	if got := waveforms(t, lb, id); len(got) != 2 || got[0].StepV != want[0].StepV {
		t.Errorf("%d waveforms", len(got))
	}
	if trial, err := lb.Trial(t.Context(), id); err != nil || !trial.Readings[0].FromWaveform {
		t.Errorf("%+v, %v", trial, err)
	}
}

// Read alone it stays a file of schema 2, whose waveforms have no step.
func TestVersion2IsRead(t *testing.T) {
	path := version(t, 2)
	p, err := packRecord(captured(100))
	if err != nil {
		t.Fatal(err)
	}
	err = execOn(t, path, fmt.Sprintf(`INSERT INTO waveform (id, trial, start_s, interval_s, samples, encoding, sha256)
  VALUES ('01900000-0000-7000-8000-00000012cafe', 1, %g, %g, x'%x', '%s', x'%x')`, p.Start, p.Interval, p.samples, p.encoding, p.digest))
	if err != nil {
		t.Fatal(err)
	}
	before, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	lb, err := OpenReadOnly(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	trials := checkVersion2(t, lb)
	want := captured(100)
	want.StepV, want.Origin = 0, ""
	got := waveforms(t, lb, trials[0].ID)
	if len(got) != 1 || !cmp.Equal(want, got[0].Record) {
		t.Errorf("waveforms %+v", got)
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

// checkVersion2 finds the digest that its decision was logged with in its trials as they are read now.
func checkVersion2(t *testing.T, lb *Logbook) []snubber.Trial {
	t.Helper()
	all := collect(t, lb, Scope{IncludeStruck: true})
	if len(all) != 3 || all[2].Struck != "the clip slipped" || len(all[2].Readings) != 5 || all[2].Readings[2].Value != 72 {
		t.Fatalf("trials %+v", all)
	}
	const digest = "2b0ab8d99ea13be5abdfe8ca1b64261af74eb410ba430ecec4d0563e8483639b"
	d := decisions(t, lb, Scope{})
	if len(d) != 1 || len(d[0].Trials) != 3 || d[0].Digest != digest || TrialsDigest(all) != digest {
		t.Errorf("decisions %+v; digest of the trials %s, want %s", d, TrialsDigest(all), digest)
	}
	return all
}

func TestVersion3MovesForward(t *testing.T) {
	path := version(t, 3)
	lb, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	checkVersion3(t, lb)
	r := mustAudit(t, lb)
	// The logbook's id and its whole chain follow from what it held.
	const id = "bae7da1d-77cc-50fb-baf3-616b34f70b7c"
	// TestChainAgainstPython has another program find the same.
	const head = "a587d506cf023e33ce90135c9dbde8d9e7ecc07ccffe232bd2c49a66b78ad82b"
	if r.Logbook != id || r.Head != head || r.Entries != 12 || r.Trials != 5 || r.Strikes != 1 || r.Decisions != 1 || r.Corrections != 5 {
		t.Errorf("%+v", r)
	}
	if n, err := lb.Count(t.Context(), Query{Words: "kestrel drawer larkspur", Scope: Scope{IncludeStruck: true}}); err != nil || n != 4 {
		t.Errorf("%d found, %v", n, err)
	}
	if err := lb.AddBoard(t.Context(), Board{Name: "Kestrel", DeviceV: 80}); err == nil || !strings.Contains(err.Error(), "100 V") {
		t.Errorf("another rating: %v", err)
	}
	if err := lb.CorrectBoard(t.Context(), Board{Name: "Kestrel", DeviceV: 80}); err != nil {
		t.Error(err)
	}
	if boards, err := lb.Boards(t.Context()); err != nil || boards[1].DeviceV != 80 || boards[1].Note != "mill spindle drive" {
		t.Errorf("%+v, %v", boards, err)
	}
	mustAdd(t, lb, example())
	if r := mustAudit(t, lb); r.Entries != 14 {
		t.Errorf("%+v", r)
	}
}

// Read alone it stays a file of schema 3, which has no chain and no index of words.
func TestVersion3IsRead(t *testing.T) {
	path := version(t, 3)
	before, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	lb, err := OpenReadOnly(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	checkVersion3(t, lb)
	if r, err := lb.Audit(t.Context(), nil); err != nil || !r.Sound() || r.Schema != 3 || !strings.Contains(r.Warning, "chains no entries") {
		t.Errorf("%+v, %v", r, err)
	}
	if n, err := lb.Count(t.Context(), Query{C: Range{Min: 1e-10}, Scope: Scope{IncludeStruck: true}}); err != nil || n != 4 {
		t.Errorf("%d found, %v", n, err)
	}
	if _, err := lb.Count(t.Context(), Query{Words: "drawer"}); err == nil || !strings.Contains(err.Error(), "open it for writing once") {
		t.Errorf("words: %v", err)
	}
	if _, err := lb.ExportJSON(t.Context(), io.Discard, nil); err == nil || !strings.Contains(err.Error(), "open it for writing once") {
		t.Errorf("export: %v", err)
	}
	backup := filepath.Join(t.TempDir(), "backup.db")
	if r, err := lb.Backup(t.Context(), backup); err != nil || !r.Sound() || r.Schema != 3 {
		t.Errorf("backup: %+v, %v", r, err)
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

func checkVersion3(t *testing.T, lb *Logbook) {
	t.Helper()
	all := collect(t, lb, Scope{IncludeStruck: true})
	if len(all) != 5 || all[0].Board != "Heron" || all[1].Struck != "the clip slipped" || !all[1].Readings[2].FromWaveform || all[4].Readings[2].Value != 73.25 {
		t.Fatalf("trials %+v", all)
	}
	const digest = "a955edc540deddf73a0122fd44689cac0fbc6ab59552c9e650d134fb49fc0560"
	if d := decisions(t, lb, Scope{}); len(d) != 1 || d[0].Digest != digest || TrialsDigest(all[1:]) != digest {
		t.Errorf("decisions %+v; digest of the trials %s, want %s", d, TrialsDigest(all[1:]), digest)
	}
	_, want := withWaveforms()
	got := waveforms(t, lb, all[1].ID)
	if len(got) != 2 || !cmp.Equal(want[0], got[0].Record) || !cmp.Equal(want[1], got[1].Record) {
		t.Errorf("waveforms %+v", got)
	}
}
