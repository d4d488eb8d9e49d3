package store

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"ringbook/snubber"
)

// contents are the texts of all entries in the order of their ids, and what stands of boards: what a logbook holds, wherever it
// was logged.
func contents(t testing.TB, lb *Logbook) []string {
	t.Helper()
	tx, err := lb.db.BeginTx(t.Context(), nil)
	if err != nil {
		t.Fatal(err)
	}
	defer tx.Rollback()
	var all []string
	err = lb.entries(t.Context(), tx, nil, func(e *entry, origin place) error {
		all = append(all, fmt.Sprintf("%s from %s %d %x", e.text(nil), origin.logbook, origin.seq, origin.link))
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	slices.Sort(all)
	boards, err := lb.Boards(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	for i := range boards { // revisions are in the order they were made, here
		slices.SortFunc(boards[i].Revisions, func(a, b Revision) int { return strings.Compare(a.Name, b.Name) })
	}
	return append(all, fmt.Sprintf("%+v", boards))
}

func mustMerge(t testing.TB, lb, other *Logbook) Merged {
	t.Helper()
	m, err := lb.Merge(t.Context(), other.Path(), nil)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// bench is a logbook of its own with something of everything, besides n trials.
func bench(t testing.TB, n int) *Logbook {
	lb := openTemp(t)
	if _, err := lb.AddAll(t.Context(), many(n), nil); err != nil {
		t.Fatal(err)
	}
	varied(t, lb)
	return lb
}

func TestMergeInAnyOrder(t *testing.T) {
	a, b, c := bench(t, 3), bench(t, 700), bench(t, 1)
	first := contents(t, a)
	if m := mustMerge(t, a, b); m.Trials != 706 || m.Strikes != 2 || m.Decisions != 1 || m.Corrections != 3 || m.Known != 0 {
		t.Errorf("a takes b: %+v", m)
	}
	if m := mustMerge(t, a, b); m.Added() != 0 || m.Known != 712 {
		t.Errorf("again: %+v", m)
	}
	mustMerge(t, c, a) // b by way of a
	if m := mustMerge(t, c, b); m.Added() != 0 {
		t.Errorf("c had all of b: %+v", m)
	}
	mustMerge(t, b, c)
	if m := mustMerge(t, a, b); m.Added() != 7+2+1+3 {
		t.Errorf("a takes c by way of b: %+v", m)
	}
	want := contents(t, a)
	if len(want) <= len(first) {
		t.Fatal("nothing was merged")
	}
	for name, lb := range map[string]*Logbook{"b": b, "c": c} {
		if diff := cmp.Diff(want, contents(t, lb)); diff != "" {
			t.Errorf("a and %s differ:\n%s", name, diff)
		}
	}
	ra, rb := mustAudit(t, a), mustAudit(t, b)
	if ra.Entries != rb.Entries || ra.Merged == 0 || ra.Logbook == rb.Logbook {
		t.Errorf("%+v\n%+v", ra, rb)
	}
	// What was merged is searched and struck as what was logged here.
	if n, err := a.Count(t.Context(), Query{Words: "drawer blue", Scope: Scope{IncludeStruck: true}}); err != nil || n != ra.Trials {
		t.Errorf("%d found of %d, %v", n, ra.Trials, err)
	}
}

// The latest statement of a board stands, in whichever logbook it was made.
func TestMergeOfBoards(t *testing.T) {
	a, b := openTemp(t), openTemp(t)
	if err := a.AddBoard(t.Context(), Board{Name: "Kestrel", DeviceV: 100, Note: "from a", Revisions: []Revision{{Name: "1", Note: "old"}}}); err != nil {
		t.Fatal(err)
	}
	if err := b.AddBoard(t.Context(), Board{Name: "Kestrel", DeviceV: 80, Revisions: []Revision{{Name: "1", Note: "new"}, {Name: "2"}}}); err != nil {
		t.Fatal(err)
	}
	mustMerge(t, a, b)
	mustMerge(t, b, a)
	want := []Board{{Name: "Kestrel", DeviceV: 80, Note: "from a", Revisions: []Revision{
		{Board: "Kestrel", Name: "1", DeviceV: 80, Note: "new"}, {Board: "Kestrel", Name: "2", DeviceV: 80}}}}
	for _, lb := range []*Logbook{a, b} {
		got, err := lb.Boards(t.Context())
		if diff := cmp.Diff(want, got); err != nil || diff != "" {
			t.Error(err, diff)
		}
		mustAudit(t, lb)
	}
}

// A copied file is the same logbook; what either logs afterwards is merged.
func TestMergeOfACopy(t *testing.T) {
	a := bench(t, 5)
	path := filepath.Join(t.TempDir(), "copy.db")
	if r, err := a.Backup(t.Context(), path); err != nil || !r.Sound() || r.Trials != 11 {
		t.Fatalf("%+v, %v", r, err)
	}
	b, err := Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer b.Close()
	mustAdd(t, a, example())
	mustAdd(t, b, example())
	mustAdd(t, b, example())
	if m := mustMerge(t, a, b); m.Trials != 2 || m.Added() != 2 {
		t.Errorf("%+v", m)
	}
	if m := mustMerge(t, b, a); m.Trials != 1 || m.Added() != 1 {
		t.Errorf("%+v", m)
	}
	if diff := cmp.Diff(contents(t, a), contents(t, b)); diff != "" {
		t.Error(diff)
	}
	mustAudit(t, a)
	mustAudit(t, b)
}

func TestMergeRefuses(t *testing.T) {
	a, b := openTemp(t), openTemp(t)
	varied(t, b)
	mustMerge(t, a, b)
	before := contents(t, a)
	refused := func(what string, other *Logbook, kind error, words string) {
		t.Helper()
		m, err := a.Merge(t.Context(), other.Path(), nil)
		if err == nil || kind != nil && !errors.Is(err, kind) || !strings.Contains(err.Error(), words) || m != (Merged{}) {
			t.Errorf("%s: %+v, %v", what, m, err)
		}
		if diff := cmp.Diff(before, contents(t, a)); diff != "" {
			t.Errorf("%s: something was merged:\n%s", what, diff)
		}
	}
	refused("itself", a, nil, "itself")
	mustAdd(t, b, example())
	last := collect(t, b, Scope{Limit: 100})
	victim := last[len(last)-1].ID
	tamper(t, b, `DROP TRIGGER trial_stays; UPDATE trial SET note = 'x' WHERE id = '`+victim+`'`)
	refused("a changed trial", b, ErrDamaged, victim)

	// The same id with another text, in a logbook whose chain is sound.
	c := openTemp(t)
	mine := collect(t, a, Scope{})[0]
	mine.Note, mine.Struck = "another", ""
	err := c.write(t.Context(), func(w *writer) error {
		_, err := w.addTrial(t.Context(), &loggedTrial{Trial: mine, loggedAt: time.Now()}, nil)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	mustAudit(t, c)
	refused("the same id", c, ErrDamaged, mine.ID)
	if _, err := a.Merge(t.Context(), filepath.Join(t.TempDir(), "none.db"), nil); !errors.Is(err, ErrMissing) {
		t.Error(err)
	}
	mustAudit(t, a)
}

// TestMergeOfOlderSchemas merges files of every schema before, which stay as they are, twice.
func TestMergeOfOlderSchemas(t *testing.T) {
	lb := openTemp(t)
	total := 0
	for schema, trials := range map[int]int{1: 5, 2: 3, 3: 5} {
		path := version(t, schema)
		before, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		m, err := lb.Merge(t.Context(), path, nil)
		if err != nil || m.Trials != trials {
			t.Errorf("schema %d: %+v, %v", schema, m, err)
		}
		if again, err := lb.Merge(t.Context(), path, nil); err != nil || again.Added() != 0 || again.Known != m.Added() {
			t.Errorf("schema %d again: %+v, %v", schema, again, err)
		}
		if after, err := os.ReadFile(path); err != nil || !bytes.Equal(before, after) {
			t.Errorf("schema %d: the file has changed, or %v", schema, err)
		}
		// Moved forward in its place it is the same logbook, all of whose entries are known.
		moved, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		mustAudit(t, moved)
		if again := mustMerge(t, lb, moved); again.Added() != 0 {
			t.Errorf("schema %d moved forward: %+v", schema, again)
		}
		moved.Close()
		total += trials
	}
	if r := mustAudit(t, lb); r.Trials != total || r.Merged != r.Entries {
		t.Errorf("%+v", r)
	}
}

func TestBackup(t *testing.T) {
	lb := bench(t, 400)
	dir := t.TempDir()
	path := filepath.Join(dir, "with spaces, größer.db")
	r, err := lb.Backup(t.Context(), path)
	if err != nil || !r.Sound() || r.Trials != 406 || r.Head != mustAudit(t, lb).Head {
		t.Fatalf("%+v, %v", r, err)
	}
	if _, err := lb.Backup(t.Context(), path); !errors.Is(err, fs.ErrExist) {
		t.Errorf("a second to the same place: %v", err)
	}
	if _, err := lb.Backup(t.Context(), filepath.Join(dir, "none", "x.db")); err == nil {
		t.Error("a folder that is not there")
	}
	if names, _ := filepath.Glob(filepath.Join(dir, "{.*,*}")); len(names) > 1 {
		t.Errorf("left beside the backup: %v", names)
	}
	reader, err := OpenReadOnly(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	defer reader.Close()
	if diff := cmp.Diff(contents(t, lb), contents(t, reader)); diff != "" {
		t.Error(diff)
	}
	again := filepath.Join(dir, "of a reader.db")
	if r, err := reader.Backup(t.Context(), again); err != nil || !r.Sound() {
		t.Errorf("%+v, %v", r, err)
	}
	if _, err := reader.db.ExecContext(t.Context(), "DELETE FROM stretch"); err == nil {
		t.Error("a reader writes after a backup")
	}
	copied, err := Open(t.Context(), again)
	if err != nil {
		t.Fatal(err)
	}
	defer copied.Close()
	mustAdd(t, copied, snubber.Trial{Board: "Kestrel", Revision: "B", Network: snubber.Network{Kind: snubber.Bare}})
	mustAudit(t, copied)
}
