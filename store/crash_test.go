package store

import (
	"bufio"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"testing"
	"time"
)

// killSoon waits until the child has the logbook open and has it killed at a random moment after.
func killSoon(cmd *exec.Cmd, lines *bufio.Scanner) {
	lines.Scan()
	time.AfterFunc(time.Duration(rand.IntN(100_000))*time.Microsecond, func() { cmd.Process.Kill() })
}

// rounds is how often a process is killed: RINGBOOK_KILLS, or few enough for an everyday test.
func rounds(t *testing.T, everyday int) int {
	if s := os.Getenv("RINGBOOK_KILLS"); s != "" {
		n, err := strconv.Atoi(s)
		if err != nil {
			t.Fatalf("RINGBOOK_KILLS=%q: %v", s, err)
		}
		return n
	}
	return everyday
}

// TestKilledWhileLogging kills a process that logs, at any moment from its first, and looks for every trial that was
// acknowledged: each must be there, once and whole.
func TestKilledWhileLogging(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	acknowledged := map[string]bool{}
	n := rounds(t, 20)
	for range n {
		cmd, lines := startChild(t, path, "1000000")
		killSoon(cmd, lines)
		for lines.Scan() {
			acknowledged[lines.Text()] = true
		}
		if err := cmd.Wait(); err == nil || cmd.ProcessState.ExitCode() != -1 {
			t.Fatalf("the child was not killed: %v", cmd.ProcessState)
		}
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		found := map[string]int{}
		for trial, err := range lb.Trials(t.Context(), Scope{}) {
			if err != nil {
				t.Fatal(err)
			}
			found[trial.ID]++
			if len(trial.Readings) != 5 || len(trial.Readings[0].Repeats) != 3 {
				t.Fatalf("trial %s is not whole: %v", trial.ID, trial.Readings)
			}
		}
		for id := range acknowledged {
			if found[id] != 1 {
				t.Errorf("trial %s was acknowledged and is there %d times", id, found[id])
			}
		}
		mustAudit(t, lb)
		lb.Close()
	}
	if len(acknowledged) == 0 {
		t.Error("no trial was acknowledged in any round: nothing was tested")
	}
	t.Logf("%d rounds, %d trials acknowledged", n, len(acknowledged))
}

// TestKilledWhileLoggingWaveforms finds each trial with all of its waveforms and readings, and none that was acknowledged
// lost. It looks at the file by OpenReadOnly, which leaves nothing beside it.
func TestKilledWhileLoggingWaveforms(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "ringbook.db")
	acknowledged := map[string]bool{}
	whole := map[string]bool{}
	_, want := withWaveforms()
	for range rounds(t, 10) {
		cmd, lines := startChild(t, path, "1000000 with waveforms")
		killSoon(cmd, lines)
		for lines.Scan() {
			acknowledged[lines.Text()] = true
		}
		cmd.Wait()
		lb, err := OpenReadOnly(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		found := map[string]bool{}
		for trial, err := range lb.Trials(t.Context(), Scope{}) {
			if err != nil {
				t.Fatal(err)
			}
			found[trial.ID] = true
			if whole[trial.ID] {
				continue
			}
			whole[trial.ID] = true
			got := waveforms(t, lb, trial.ID)
			if len(trial.Readings) != 5 || !trial.Readings[0].FromWaveform || len(got) != len(want) {
				t.Fatalf("trial %s is not whole: %d waveforms, %v", trial.ID, len(got), trial.Readings)
			}
			for i := range want {
				if !slices.Equal(want[i].Volts, got[i].Volts) {
					t.Fatalf("waveform %s of trial %s is another", got[i].ID, trial.ID)
				}
			}
		}
		var loose int
		if err := lb.db.QueryRowContext(t.Context(), "SELECT count(*) FROM waveform WHERE trial NOT IN (SELECT seq FROM trial)").Scan(&loose); err != nil || loose != 0 {
			t.Fatalf("%d waveforms without a trial, %v", loose, err)
		}
		for id := range acknowledged {
			if !found[id] {
				t.Errorf("trial %s was acknowledged and is not there", id)
			}
		}
		if err := lb.Close(); err != nil {
			t.Fatal(err)
		}
		if names, _ := filepath.Glob(filepath.Join(dir, "*")); len(names) != 1 {
			t.Errorf("left beside the logbook: %v", names)
		}
	}
	if len(acknowledged) == 0 {
		t.Error("no trial was acknowledged in any round: nothing was tested")
	}
	t.Logf("%d trials acknowledged", len(acknowledged))
}

// TestKilledWhileImporting finds whole imports alone.
func TestKilledWhileImporting(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ringbook.db")
	imported, n := 0, rounds(t, 10)
	for range n {
		cmd, lines := startChild(t, path, "import")
		killSoon(cmd, lines)
		for lines.Scan() {
			imported += importSize
		}
		cmd.Wait()
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		held := len(collect(t, lb, Scope{}))
		if held%importSize != 0 || held < imported || held > imported+importSize {
			t.Fatalf("%d trials: %d were acknowledged, in imports of %d", held, imported, importSize)
		}
		imported = held
		mustAudit(t, lb)
		lb.Close()
	}
	if imported == 0 {
		t.Error("no import was finished in any round: nothing was tested")
	}
	t.Logf("%d rounds, %d trials imported", n, imported)
}

// TestKilledWhileMaking kills a process that makes a new logbook.
func TestKilledWhileMaking(t *testing.T) {
	for range rounds(t, 20) {
		path := filepath.Join(t.TempDir(), "ringbook.db")
		cmd, _ := startChild(t, path, "look")
		time.AfterFunc(time.Duration(rand.IntN(30_000))*time.Microsecond, func() { cmd.Process.Kill() })
		cmd.Wait()
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		mustAdd(t, lb, example())
		lb.Close()
	}
}

// TestKilledWhileMerging finds all of the other logbook merged or nothing, and both sound.
func TestKilledWhileMerging(t *testing.T) {
	other := bench(t, 500)
	want := contents(t, other)
	merged, n := 0, rounds(t, 6)
	for range n {
		path := filepath.Join(t.TempDir(), "ringbook.db")
		cmd, lines := startChild(t, path, "merge "+other.Path())
		lines.Scan() // ready
		time.AfterFunc(time.Duration(rand.IntN(250_000))*time.Microsecond, func() { cmd.Process.Kill() })
		lines.Scan()
		cmd.Wait()
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		switch r := mustAudit(t, lb); {
		case r.Entries == 0 && lines.Text() == "":
		case r.Entries != len(want)-1: // without the boards
			t.Errorf("%d entries, want none or %d", r.Entries, len(want)-1)
		default:
			merged++
		}
		mustMerge(t, lb, other)
		if got := contents(t, lb); !slices.Equal(got, want) {
			t.Error("merged again, it holds something else")
		}
		lb.Close()
	}
	mustAudit(t, other)
	t.Logf("%d rounds, %d of them merged before the kill", n, merged)
}

// TestKilledWhileMigrating finds a file of an older schema or one moved forward, with all it had.
func TestKilledWhileMigrating(t *testing.T) {
	moved, n := 0, rounds(t, 15)
	for i := range n {
		path := version(t, 1+i%3)
		cmd, _ := startChild(t, path, "look")
		time.AfterFunc(time.Duration(rand.IntN(60_000))*time.Microsecond, func() { cmd.Process.Kill() })
		cmd.Wait()
		// It is looked at with what the killed program left beside it.
		if schema := schemaBehind(t, path); schema == 4 {
			moved++
		} else if schema < 1+i%3 || schema > 4 {
			t.Errorf("schema %d", schema)
		}
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		if r := mustAudit(t, lb); r.Trials != []int{5, 3, 5}[i%3] || r.Schema != 4 {
			t.Errorf("%+v", r)
		}
		lb.Close()
	}
	t.Logf("%d rounds, %d of them moved before the kill", n, moved)
}

func schemaBehind(t testing.TB, path string) int {
	t.Helper()
	lb, err := OpenReadOnly(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer lb.Close()
	schema, err := schemaOf(t.Context(), lb.db)
	if err != nil {
		t.Fatal(err)
	}
	return schema
}
