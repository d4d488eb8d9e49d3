package store

import (
	"errors"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func TestStrike(t *testing.T) {
	lb := openTemp(t)
	id, other := mustAdd(t, lb, example()), mustAdd(t, lb, example())
	if err := lb.Strike(t.Context(), ShortID(id), "probe fell off"); err != nil {
		t.Fatal(err)
	}
	got, err := lb.Trial(t.Context(), strings.ToUpper(id))
	if err != nil {
		t.Fatal(err)
	}
	want := example()
	want.ID, want.Struck = id, "probe fell off"
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error("a struck trial stays readable (-want +got):\n" + diff)
	}
	if all := collect(t, lb, Scope{}); len(all) != 1 || all[0].ID != other {
		t.Errorf("what stands: %v", all)
	}
	for _, c := range []struct {
		id, because string
		kind        error
		says        string
	}{
		{id, "again", ErrStruck, "probe fell off"},
		{other, " \n", nil, "no reason given"},
		{other, "\x1b[2J", nil, "control character"},
		{"01234567-89ab-7def-8123-456789abcdef", "x", ErrNoTrial, "no such trial"},
		{"abc", "x", ErrNoTrial, "6 or more"},
		{"'; DROP TABLE trial; --", "x", ErrNoTrial, "6 or more"},
		{"%%%%%%", "x", ErrNoTrial, "6 or more"},
	} {
		err := lb.Strike(t.Context(), c.id, c.because)
		if err == nil || (c.kind != nil && !errors.Is(err, c.kind)) || !strings.Contains(err.Error(), c.says) || !strings.Contains(err.Error(), quote(c.id)) {
			t.Errorf("strike %q because %q: error %v; want %q", c.id, c.because, err, c.says)
		}
	}
	if n := len(collect(t, lb, Scope{})); n != 1 {
		t.Errorf("%d trials stand, want 1", n)
	}
}

func TestIDsThatEndAlike(t *testing.T) {
	lb := openTemp(t)
	mustAdd(t, lb, example())
	for _, id := range []string{"01900000-0000-7000-8000-00000012cafe", "01900000-0000-7000-8000-00000112cafe"} {
		_, err := lb.db.ExecContext(t.Context(), `INSERT INTO trial (id, revision, at, logged_at, network) SELECT ?, revision, at, at, 'bare' FROM trial LIMIT 1`, id)
		if err != nil {
			t.Fatal(err)
		}
	}
	if _, err := lb.Trial(t.Context(), "12cafe"); err == nil || !strings.Contains(err.Error(), "00000012cafe, 01900000-0000-7000-8000-00000112cafe; give more") {
		t.Errorf("two that end alike: %v", err)
	}
	if got, err := lb.Trial(t.Context(), "0112cafe"); err != nil || got.ID != "01900000-0000-7000-8000-00000112cafe" {
		t.Errorf("%v, %v", got.ID, err)
	}
}

// TestNothingIsOverwritten tries it as another program would, with SQLite's own defaults.
func TestNothingIsOverwritten(t *testing.T) {
	lb := openTemp(t)
	id := mustAdd(t, lb, example())
	if err := lb.Strike(t.Context(), id, "probe fell off"); err != nil {
		t.Fatal(err)
	}
	if _, err := lb.db.ExecContext(t.Context(), `INSERT INTO waveform (id, trial, start_s, interval_s, samples, encoding, sha256)
		SELECT id, seq, 0, 1e-9, x'00', 'none', zeroblob(32) FROM trial`); err != nil {
		t.Fatal(err)
	}
	before := collect(t, lb, Scope{IncludeStruck: true})
	for _, table := range []string{"trial", "reading", "reading_repeat", "waveform", "strike"} {
		column := map[string]string{"trial": "note", "reading": "value", "reading_repeat": "value", "waveform": "origin", "strike": "because"}[table]
		for script, says := range map[string]string{
			"UPDATE " + table + " SET " + column + " = 1":                 "is never changed",
			"DELETE FROM " + table:                                        "is never deleted",
			"INSERT OR REPLACE INTO " + table + " SELECT * FROM " + table: "is never replaced",
		} {
			err := execOn(t, lb.Path(), script)
			if err == nil || !strings.Contains(err.Error(), says) {
				t.Errorf("%s: error %v; want %q", script, err, says)
			}
		}
	}
	if diff := cmp.Diff(before, collect(t, lb, Scope{IncludeStruck: true})); diff != "" {
		t.Error("(-before +after):\n" + diff)
	}
}

func TestTheSchemaRefusesNonsense(t *testing.T) {
	lb := openTemp(t)
	mustAdd(t, lb, example())
	for _, script := range []string{
		`INSERT INTO reading (trial, quantity, value) VALUES (1, 'bus_v', 9e999)`,
		`INSERT INTO reading (trial, quantity, value) VALUES (1, 'bus_v', NULL)`,
		`INSERT INTO reading (trial, quantity, value) VALUES (1, 'bus_v', 'high')`,
		`INSERT INTO reading (trial, quantity, value, u) VALUES (1, 'bus_v', 1, -1)`,
		`INSERT INTO reading (trial, quantity, value) VALUES (1, 'switching_hz', 0)`,
		`INSERT INTO reading (trial, quantity, value) VALUES (99, 'bus_v', 1)`,
		`INSERT INTO reading_repeat (trial, quantity, n, value) VALUES (1, 'bus_v', 1, 1)`,
		`INSERT INTO trial (id, revision, at, logged_at, network, c) SELECT substr(id, 2) || 'x', revision, at, at, 'bare', 1e-9 FROM trial`,
		`INSERT INTO trial (id, revision, at, logged_at, network) SELECT substr(id, 2) || 'x', revision, at, at, 'rc' FROM trial`,
		`INSERT INTO trial (id, revision, at, logged_at, network) SELECT substr(id, 2) || 'x', revision, '2026-01-01', at, 'bare' FROM trial`,
		`INSERT INTO trial (id, revision, at, logged_at, network) SELECT substr(id, 2) || 'x', 99, at, at, 'bare' FROM trial`,
		`INSERT INTO strike (id, trial, at, because) SELECT id, seq, at, ' ' FROM trial`,
		`INSERT INTO board (name, device_v) VALUES ('x', 0)`,
		`INSERT INTO operating_point (bus_v) VALUES (48), (48)`,
	} {
		if _, err := lb.db.ExecContext(t.Context(), script); err == nil {
			t.Errorf("accepted: %s", script)
		}
	}
}
