package store

import (
	"bytes"
	"context"
	"database/sql"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// dump is every row of every table that keeps what was logged, or "unreadable" where SQLite cannot read them all.
func dump(t testing.TB, path string) string {
	t.Helper()
	db, err := sql.Open("sqlite", dsn(path, "mode=ro&immutable=1", busyWait))
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	var all strings.Builder
	for _, table := range strings.Fields("logbook board revision session instrument operating_point trial reading reading_repeat waveform strike decision decision_trial correction chain origin") {
		rows, err := db.QueryContext(t.Context(), "SELECT * FROM "+table+" NOT INDEXED")
		if err != nil {
			return "unreadable"
		}
		names, err := rows.Columns()
		if err != nil {
			return "unreadable"
		}
		for rows.Next() {
			cells := make([]any, len(names))
			into := make([]any, len(names))
			for i := range cells {
				into[i] = &cells[i]
			}
			if err := rows.Scan(into...); err != nil {
				return "unreadable"
			}
			fmt.Fprintf(&all, "%s %T %v\n", table, cells, cells)
		}
		if rows.Err() != nil || rows.Close() != nil {
			return "unreadable"
		}
	}
	return all.String()
}

// TestAuditFindsFlippedBytes flips random bytes of a logbook, and has the audit find every flip that changed a row. It is
// done RINGBOOK_KILLS times.
func TestAuditFindsFlippedBytes(t *testing.T) {
	lb := openTemp(t)
	varied(t, lb)
	mustMerge(t, lb, bench(t, 20))
	path := lb.Path()
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	sound, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	want := dump(t, path)
	changed, found, refused := 0, 0, 0
	n := rounds(t, 60)
	for i := range n {
		random := rand.New(rand.NewPCG(uint64(i), 8))
		data := bytes.Clone(sound)
		for range 1 + random.IntN(4) {
			data[random.IntN(len(data))] ^= byte(1 + random.IntN(255))
		}
		flipped := filepath.Join(t.TempDir(), "flipped.db")
		if err := os.WriteFile(flipped, data, 0o644); err != nil {
			t.Fatal(err)
		}
		is := dump(t, flipped) != want
		if is {
			changed++
		}
		switch r, err := auditFile(context.Background(), flipped); {
		case err != nil:
			refused++
			if !strings.HasPrefix(err.Error(), "logbook ") && !strings.HasPrefix(err.Error(), "audit: ") {
				t.Errorf("round %d: %v", i, err)
			}
		case !r.Sound():
			found++
		case is:
			t.Errorf("round %d: a row changed, and the audit finds nothing", i)
		}
	}
	t.Logf("%d rounds: %d changed a row; the audit found damage in %d and %d could not be opened", n, changed, found, refused)
	if changed == 0 {
		t.Error("no row changed in any round: nothing was tested")
	}
}
