package store

import (
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"strings"
	"testing"
)

// mustAudit finds a logbook sound.
func mustAudit(t testing.TB, lb *Logbook) Report {
	t.Helper()
	r, err := lb.Audit(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	if !r.Sound() {
		t.Fatalf("the audit finds: %v and %d more", r.Damage, r.More)
	}
	return r
}

// varied fills a logbook with some of everything: trials with readings, repeats and waveforms, strikes, a decision, boards
// stated and corrected.
func varied(t testing.TB, lb *Logbook) {
	t.Helper()
	board := Board{Name: "Kestrel", DeviceV: 100, Note: "mill spindle drive", Revisions: []Revision{{Name: "A", Note: "long loop"}, {Name: "B"}}}
	if err := lb.AddBoard(t.Context(), board); err != nil {
		t.Fatal(err)
	}
	trials := logged(t, lb, 4)
	id, _ := mustAddWithWaveforms(t, lb)
	struck := example()
	struck.Board, struck.Struck = "Heron", "the clip slipped"
	mustAdd(t, lb, struck)
	mustDecide(t, lb, decided(trials...))
	if err := lb.Strike(t.Context(), id, "probe \\ fell\noff"); err != nil {
		t.Fatal(err)
	}
	board.DeviceV = 80
	if err := lb.CorrectBoard(t.Context(), board); err != nil {
		t.Fatal(err)
	}
}

func TestAuditOfASoundLogbook(t *testing.T) {
	lb := openTemp(t)
	if r := mustAudit(t, lb); r.Entries != 0 || len(r.Logbook) != 36 || len(r.Head) != 64 {
		t.Errorf("an empty logbook: %+v", r)
	}
	varied(t, lb)
	var told [][2]int64
	r, err := lb.Audit(t.Context(), func(done, all int64) { told = append(told, [2]int64{done, all}) })
	// Three of the four corrections are the board's first statement; the fourth is its rating.
	if err != nil || !r.Sound() || r.Trials != 6 || r.Strikes != 2 || r.Decisions != 1 || r.Corrections != 4 || r.Entries != 13 || r.Schema != 4 {
		t.Errorf("%+v, %v", r, err)
	}
	if len(told) != 1 || told[0] != [2]int64{13, 13} {
		t.Errorf("progress %v", told)
	}
	reader, err := OpenReadOnly(t.Context(), lb.Path())
	if err != nil {
		t.Fatal(err)
	}
	defer reader.Close()
	if again := mustAudit(t, reader); again.Head != r.Head {
		t.Errorf("read alone, its head is %s, not %s", again.Head, r.Head)
	}
}

func TestAuditOfALongLogbook(t *testing.T) {
	lb := openTemp(t)
	if _, err := lb.AddAll(t.Context(), many(2*auditChunk+100), nil); err != nil {
		t.Fatal(err)
	}
	mustAdd(t, lb, example())
	varied(t, lb)
	if r := mustAudit(t, lb); r.Trials != 2*auditChunk+107 {
		t.Errorf("%+v", r)
	}
	tamper(t, lb, fmt.Sprintf(`DROP TRIGGER chain_kept; DELETE FROM chain WHERE seq = %d`, auditChunk+1))
	r, err := lb.Audit(t.Context(), nil)
	if err != nil || r.Sound() || r.Damage[0].Entry != auditChunk+1 {
		t.Errorf("%+v, %v", r, err)
	}
}

// tamper changes the file behind the program's back.
func tamper(t testing.TB, lb *Logbook, script string) {
	t.Helper()
	conn, err := lb.db.Conn(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close()
	if _, err := conn.ExecContext(t.Context(), "PRAGMA foreign_keys = OFF; PRAGMA ignore_check_constraints = ON; "+script); err != nil {
		t.Fatal(err)
	}
	if _, err := conn.ExecContext(t.Context(), "PRAGMA foreign_keys = ON; PRAGMA ignore_check_constraints = OFF"); err != nil {
		t.Fatal(err)
	}
}

// TestAuditNamesWhatDiffers changes one thing at a time in a copy of the same logbook.
func TestAuditNamesWhatDiffers(t *testing.T) {
	for change, want := range map[string]string{
		`UPDATE trial SET note = 'another' WHERE seq = 2`:                                                                  "entry 5, trial %[2]s: it is not what was logged",
		`UPDATE trial SET logged_at = '2026-03-01T09:30:00.000000000Z' WHERE seq = 2`:                                      "entry 5, trial %[2]s: it is not what was logged",
		`UPDATE trial SET at = 'yesterday' WHERE seq = 2`:                                                                  "entry 5, trial %[2]s: its time \"yesterday\"",
		`UPDATE trial SET c = c * (1 + 1e-15) WHERE seq = 1`:                                                               "entry 4, trial %[1]s",
		`UPDATE trial SET revision = 99 WHERE seq = 1`:                                                                     "entry 4, trial %[1]s: the revision it names is not there",
		`UPDATE trial SET revision = 1 WHERE seq = 1`:                                                                      "entry 4, trial %[1]s",
		`UPDATE trial SET operating_point = NULL WHERE seq = 1`:                                                            "entry 4, trial %[1]s",
		`UPDATE session SET name = 'evening'`:                                                                              "entry 4, trial %[1]s",
		`UPDATE instrument SET idn = 'x' WHERE id = 2`:                                                                     "entry 4, trial %[1]s",
		`UPDATE operating_point SET bus_v = 47.5`:                                                                          "entry 4, trial %[1]s",
		`UPDATE reading SET value = 71.26 WHERE trial = 3 AND quantity = 'peak_v'`:                                         "entry 6, trial %[3]s",
		`UPDATE reading SET u = 1 WHERE trial = 3 AND quantity = 'peak_v'`:                                                 "entry 6, trial %[3]s",
		`UPDATE reading SET from_waveform = 1 WHERE trial = 3 AND quantity = 'peak_v'`:                                     "entry 6, trial %[3]s",
		`DELETE FROM reading WHERE trial = 3 AND quantity = 'temp_c'`:                                                      "entry 6, trial %[3]s",
		`INSERT INTO reading (trial, quantity, value) VALUES (3, 'bus_v', 48)`:                                             "entry 6, trial %[3]s",
		`UPDATE reading_repeat SET value = 1.9e6 WHERE trial = 4 AND n = 2`:                                                "entry 7, trial %[4]s",
		`UPDATE waveform SET interval_s = 5e-10 WHERE seq = 1`:                                                             "entry 8, trial %[5]s",
		`UPDATE waveform SET samples = x'00' WHERE seq = 1`:                                                                "entry 8, trial %[5]s: the samples of its waveform",
		`DELETE FROM waveform WHERE seq = 2`:                                                                               "entry 8, trial %[5]s",
		`UPDATE strike SET because = 'nothing' WHERE seq = 1`:                                                              "entry 10, strike",
		`UPDATE strike SET trial = 2 WHERE seq = 2`:                                                                        "entry 12, strike",
		`DELETE FROM strike WHERE seq = 1`:                                                                                 "entry 10, a strike: its row 1 is missing",
		`UPDATE decision SET peak_v = 74`:                                                                                  "entry 11, decision",
		`UPDATE decision SET recommendation = '{}'`:                                                                        "entry 11, decision",
		`DELETE FROM decision_trial WHERE trial = 2`:                                                                       "entry 11, decision",
		`UPDATE correction SET device_v = 120 WHERE seq = 1`:                                                               "entry 1, correction",
		`UPDATE board SET device_v = 120 WHERE id = 1`:                                                                     `board "Kestrel": its rating or note is not what was last stated`,
		`UPDATE revision SET note = 'x' WHERE id = 1`:                                                                      `board "Kestrel", revision "A": its rating`,
		`DELETE FROM trial WHERE seq = 2`:                                                                                  "entry 5, a trial: its row 2 is missing",
		`DELETE FROM trial WHERE seq = 6`:                                                                                  "entry 9, a trial: its row 6 is missing",
		`INSERT INTO strike (id, trial, at, because) SELECT replace(id, '-7', '-8'), 3, at, 'x' FROM strike WHERE seq = 1`: "strike %[7]s: it is not in the chain",
		`UPDATE chain SET link = zeroblob(32) WHERE seq = 5`:                                                               "entry 5, trial %[2]s",
		`UPDATE chain SET row = 3 WHERE seq = 5`:                                                                           "entry 5, trial %[2]s: it is not in the chain",
		`UPDATE chain SET kind = 'strike' WHERE seq = 5`:                                                                   "entry 5",
		`DELETE FROM chain WHERE seq = 5`:                                                                                  "entry 5",
		`DELETE FROM chain WHERE seq = 13`:                                                                                 "correction %[8]s: it is not in the chain",
		`UPDATE logbook SET id = replace(id, '-7', '-8')`:                                                                  "entry 1, correction",
		`UPDATE stretch SET newest = oldest; INSERT INTO stretch VALUES (6, '2026', '2027')`:                               "index of words",
		`PRAGMA writable_schema = 1; DELETE FROM sqlite_schema WHERE name = 'trial_by_time'; PRAGMA writable_schema = 0`:   "",
	} {
		lb := openTemp(t)
		varied(t, lb)
		var ids []any
		for trial, err := range lb.Trials(t.Context(), Scope{IncludeStruck: true}) {
			if err != nil {
				t.Fatal(err)
			}
			ids = append(ids, trial.ID)
		}
		byRow := ids[:0:0]
		rows, err := lb.db.QueryContext(t.Context(), `SELECT id FROM (SELECT id, seq FROM trial ORDER BY seq)
UNION ALL SELECT replace(id, '-7', '-8') FROM strike WHERE seq = 1 UNION ALL SELECT id FROM correction WHERE seq = 4`)
		if err != nil {
			t.Fatal(err)
		}
		for rows.Next() {
			var id string
			if err := rows.Scan(&id); err != nil {
				t.Fatal(err)
			}
			byRow = append(byRow, id)
		}
		rows.Close()
		tamper(t, lb, `DROP TRIGGER trial_stays; DROP TRIGGER trial_kept; DROP TRIGGER reading_stays; DROP TRIGGER reading_kept;
DROP TRIGGER reading_repeat_stays; DROP TRIGGER waveform_stays; DROP TRIGGER waveform_kept; DROP TRIGGER strike_stays; DROP TRIGGER strike_kept;
DROP TRIGGER decision_stays; DROP TRIGGER decision_trial_kept; DROP TRIGGER correction_stays; DROP TRIGGER chain_stays; DROP TRIGGER chain_kept; DROP TRIGGER logbook_stays; `+change)
		r, err := lb.Audit(t.Context(), nil)
		if err != nil {
			t.Errorf("%s: %v", change, err)
			continue
		}
		if want == "" {
			continue
		}
		if strings.Contains(want, "%") {
			want = strings.Split(fmt.Sprintf(want, byRow...), "%!(EXTRA")[0]
		}
		if r.Sound() || !strings.Contains(r.Damage[0].String(), want) {
			t.Errorf("%s:\n found %v\n want  %s first", change, r.Damage, want)
		}
	}
}

func TestAuditIsEnded(t *testing.T) {
	lb := openTemp(t)
	varied(t, lb)
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := lb.Audit(ctx, nil); !errors.Is(err, context.Canceled) {
		t.Error(err)
	}
}

// TestChainAgainstPython has another program (testdata/chain.py) compute every link from the tables: of a logbook with some of
// everything and another merged into it, and of one moved forward from schema 3. It runs the Python that RINGBOOK_PYTHON names,
// /usr/bin/python3 where that is not set; where it is missing the test is skipped, unless RINGBOOK_CHECKS is "all".
func TestChainAgainstPython(t *testing.T) {
	python := os.Getenv("RINGBOOK_PYTHON")
	if python == "" {
		python = "/usr/bin/python3"
	}
	if err := exec.CommandContext(t.Context(), python, "-c", "import sqlite3").Run(); err != nil {
		if os.Getenv("RINGBOOK_CHECKS") == "all" {
			t.Fatalf("no %s with sqlite3: %v", python, err)
		}
		t.Skipf("no %s with sqlite3: %v", python, err)
	}
	full := bench(t, 20)
	mustMerge(t, full, bench(t, 5))
	for _, path := range []string{full.Path(), version(t, 3)} {
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		r := mustAudit(t, lb)
		want := fmt.Sprintln(r.Logbook, r.Head, r.Entries)
		if err := lb.Close(); err != nil {
			t.Fatal(err)
		}
		out, err := exec.CommandContext(t.Context(), python, "testdata/chain.py", path).CombinedOutput()
		if err != nil || string(out) != want {
			t.Errorf("%v: it says\n%swant\n%s", err, out, want)
		}
	}
}
