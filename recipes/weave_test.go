package recipes

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/store"
)

// bench is a logbook of an invented board with a trial for each minute given, of revision B where none is named.
func bench(t *testing.T, minutes ...int) (lb *store.Logbook, path string) {
	t.Helper()
	path = filepath.Join(t.TempDir(), "ringbook.db")
	lb, err := store.Open(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { lb.Close() })
	for _, m := range minutes {
		add(t, lb, "B", m)
	}
	return lb, path
}

func add(t *testing.T, lb *store.Logbook, revision string, minute int) {
	t.Helper()
	if _, err := lb.Add(t.Context(), snubber.Trial{
		Board: "winch-drive", Revision: revision, Network: snubber.Network{Kind: snubber.Bare}, At: time.Date(2026, 3, 1, 9, minute, 0, 0, time.UTC),
		Readings: []snubber.Reading{{Quantity: snubber.RingHz, Value: 88e6, U: 1e5}},
	}); err != nil {
		t.Fatal(err)
	}
}

func text(t *testing.T, p *page.Page) string {
	t.Helper()
	var b bytes.Buffer
	if err := p.Text(&b, page.TextOptions{Width: 400}); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// asked is a recipe that reads the trials as often as told, puts them on the page, and fails as told.
func asked(times int, fail func() error) Recipe {
	return Recipe{Name: "asked", Title: "Trials", Single: true, Weave: func(ctx context.Context, p *page.Page, src Source) error {
		for range times {
			trials, err := src.Trials(ctx)
			if err != nil {
				return err
			}
			p.Table(trialTable("Trials", trials))
			src.Scope.Since = trials[0].At.Add(time.Second) // the next time without the first
		}
		p.Say("To the end.")
		return fail()
	}}
}

func well() error { return nil }

// The digest at the foot is that of the trials read, each once, and of no others.
func TestFootOfWhatWasRead(t *testing.T) {
	lb, _ := bench(t, 1, 2, 3)
	all, err := Source{Logbook: lb}.Trials(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	src := Source{Logbook: lb}
	for _, c := range []struct {
		times int
		since time.Time
		want  string
		scope string
	}{
		{0, time.Time{}, "", "Scope: winch-drive B\n"},
		{1, time.Time{}, store.TrialsDigest(all), "Scope: winch-drive B\n"},
		{2, time.Time{}, store.TrialsDigest(all), "Scope: winch-drive B\n"},
		{1, all[1].At, store.TrialsDigest(all[1:]), "Scope: winch-drive B, since 2026-03-01T09:02:00Z\n"},
	} {
		src.Scope.Since = c.since
		w, err := asked(c.times, well).Page(t.Context(), src)
		if err != nil {
			t.Fatal(err)
		}
		got := text(t, w.Page)
		if w.Digest != c.want || strings.Contains(got, "Digest of the rows used: "+c.want+"\n") != (c.want != "") {
			t.Errorf("read %d times: digest %q, want %q: %s", c.times, w.Digest, c.want, got)
		}
		if !strings.Contains(got, c.scope) || !strings.HasPrefix(got, "Trials of winch-drive B\n") || w.Empty {
			t.Errorf("title or scope, want %q: %s", c.scope, got)
		}
	}
}

func TestPageOfARecipeThatFails(t *testing.T) {
	lb, _ := bench(t, 1)
	src := Source{Logbook: lb}
	failed := errors.New("the cable is out; push it in")
	for _, c := range []struct {
		name  string
		times int
		fail  func() error
		says  string
		empty bool
	}{
		{"at once", 0, func() error { return failed }, failed.Error(), true},
		{"after a table", 1, func() error { return failed }, failed.Error(), false},
		{"by a panic", 1, func() error { panic("out of range") }, "out of range", false},
		{"by an index", 1, func() error { return []error{}[len(os.Args)] }, "index out of range", false},
	} {
		w, err := asked(c.times, c.fail).Page(t.Context(), src)
		if err == nil || w == nil {
			t.Fatalf("%s: %v, %v", c.name, w, err)
		}
		got := text(t, w.Page)
		if !strings.Contains(err.Error(), c.says) || !strings.Contains(got, "Error: ") || !strings.Contains(got, c.says) || w.Empty != c.empty {
			t.Errorf("%s: %v, empty %v: %s", c.name, err, w.Empty, got)
		}
	}
	add(t, lb, "C", 2)
	if w, err := asked(1, well).Page(t.Context(), src); !errors.Is(err, ErrSeveral) || w != nil {
		t.Errorf("two revisions: %v, %v", w, err)
	}
	src.Scope.Board = "mill"
	if w, err := asked(1, well).Page(t.Context(), src); err == nil || w != nil || !strings.Contains(err.Error(), "winch-drive B, winch-drive C") {
		t.Errorf("no such board: %v, %v", w, err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	src.Scope.Board, src.Scope.Revision = "winch-drive", "B"
	if w, err := asked(1, func() error { cancel(); return ctx.Err() }).Page(ctx, src); !errors.Is(err, context.Canceled) || w != nil {
		t.Errorf("interrupted: %v, %v", w, err)
	}
}

func TestAllRecipes(t *testing.T) {
	seen := map[string]bool{}
	for _, r := range All() {
		if r.Name == "" || seen[r.Name] || r.Short == "" || strings.HasSuffix(r.Short, ".") || r.Title == "" || r.Weave == nil || r.Name == "new" {
			t.Errorf("recipe %+v", r)
		}
		seen[r.Name] = true
	}
}

// A recipe of one's own, by its command line.
func TestMainOfARecipe(t *testing.T) {
	lb, path := bench(t, 1, 2)
	dir := t.TempDir()
	out := filepath.Join(dir, "page.txt")
	good, bad := asked(1, well), asked(1, func() error { return errors.New("the cable is out") })
	for _, c := range []struct {
		recipe         Recipe
		args           []string
		want           int
		stdout, stderr string // what is in them; "" for nothing
		file           string
	}{
		{good, nil, 0, "To the end.", "", ""},
		{good, []string{"-board", "winch-drive", "-revision", "B", "-o", out}, 0, "", "", "To the end."},
		{bad, []string{"-o", out}, 1, "", "it exists; name another file, or replace it with --force", "To the end."},
		{bad, []string{"-o", out, "--force"}, 1, "", "asked: the cable is out\n", "Error: the cable is out"},
		{bad, nil, 1, "Error: the cable is out", "asked: the cable is out\n", ""},
		{asked(0, func() error { return errors.New("the cable is out") }), []string{"-o", filepath.Join(dir, "none.txt")}, 1, "", "asked: the cable is out\n", ""},
		{good, []string{"-board", "mill"}, 1, "", `asked: logbook ` + path + ` holds no trial of board "mill"`, ""},
		{good, []string{"-logbook", filepath.Join(dir, "none.db")}, 1, "", "there is no logbook in that place", ""},
		{good, []string{"-o", "page.pdf"}, 2, "", "its ending must be one of .html", ""},
		{good, []string{"-limit", "3"}, 2, "", "flag provided but not defined: -limit", ""},
		{good, []string{"now"}, 2, "", `asked: "now" is one word too many`, ""},
		{good, []string{"-help"}, 0, "", "-logbook FILE", ""},
	} {
		var stdout, stderr bytes.Buffer
		got := run(t.Context(), c.recipe, append([]string{"-logbook", path}, c.args...), &stdout, &stderr)
		for name, x := range map[string][2]string{"stdout": {stdout.String(), c.stdout}, "stderr": {stderr.String(), c.stderr}} {
			if !strings.Contains(x[0], x[1]) || x[1] == "" && x[0] != "" {
				t.Errorf("%q: %s %q, want %q", c.args, name, x[0], x[1])
			}
		}
		if got != c.want {
			t.Errorf("%q: exit code %d, want %d", c.args, got, c.want)
		}
		if file, err := os.ReadFile(out); c.file != "" && (err != nil || !strings.Contains(string(file), c.file)) {
			t.Errorf("%q: the file has %q (%v), want %q", c.args, file, err, c.file)
		}
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	var stderr bytes.Buffer
	if got := run(ctx, good, []string{"-logbook", path}, &stderr, &stderr); got != 1 {
		t.Errorf("interrupted: exit code %d, %s", got, stderr.String())
	}
	add(t, lb, "C", 3)
	if got := run(t.Context(), good, []string{"-logbook", path}, &stderr, &stderr); got != 2 || !strings.Contains(stderr.String(), "name one with --board and --revision") {
		t.Errorf("two revisions: exit code %d, %s", got, stderr.String())
	}
	names := []string{}
	for name := range folder(t, dir) {
		names = append(names, name)
	}
	if !slices.Equal(names, []string{"page.txt"}) {
		t.Errorf("the folder has %q", names)
	}
}

// A link to a file stays a link; the file it leads to is replaced.
func TestFileThroughALink(t *testing.T) {
	lb, _ := bench(t, 1)
	w, err := asked(1, well).Page(t.Context(), Source{Logbook: lb})
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	real, link := filepath.Join(dir, "real.md"), filepath.Join(dir, "link.md")
	if err := os.WriteFile(real, []byte("old"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("real.md", link); err != nil {
		t.Skip(err)
	}
	f, err := NewFile(link, true)
	if err != nil {
		t.Fatal(err)
	}
	paths, err := f.Write(w.Page)
	if err != nil || !slices.Equal(paths, []string{link}) {
		t.Fatalf("%q, %v", paths, err)
	}
	got, err := os.ReadFile(real)
	if err != nil || !bytes.HasPrefix(got, []byte("# Trials of winch-drive B\n")) {
		t.Errorf("%q, %v", got, err)
	}
	if info, err := os.Lstat(link); err != nil || info.Mode()&os.ModeSymlink == 0 {
		t.Errorf("the link is %v, %v", info.Mode(), err)
	}
}

func ExampleRecipe_Page() {
	ctx := context.Background()
	dir, err := os.MkdirTemp("", "ringbook-example-")
	if err != nil {
		fmt.Println(err)
		return
	}
	defer os.RemoveAll(dir)
	lb, err := store.Open(ctx, filepath.Join(dir, "ringbook.db"))
	if err != nil {
		fmt.Println(err)
		return
	}
	defer lb.Close()
	trial := snubber.Trial{Board: "winch-drive", Revision: "B", Network: snubber.Network{Kind: snubber.Bare}}
	trial.Readings = []snubber.Reading{{Quantity: snubber.RingHz, Value: 88e6, U: 1e5}}
	if _, err := lb.Add(ctx, trial); err != nil {
		fmt.Println(err)
		return
	}
	rings := Recipe{Title: "Rings", Single: true, Weave: func(ctx context.Context, p *page.Page, src Source) error {
		trials, err := src.Trials(ctx)
		if err != nil {
			return err
		}
		p.Say("**%d trial** was read.", len(trials))
		return nil
	}}
	woven, err := rings.Page(ctx, Source{Logbook: lb})
	if err != nil {
		fmt.Println(err)
		return
	}
	woven.Foot(page.Foot{}) // its digest is another each time this example logs a trial
	if err := woven.Text(os.Stdout, page.TextOptions{}); err != nil {
		fmt.Println(err)
	}
	// Output:
	// Rings of winch-drive B
	// ══════════════════════
	//
	// 1 trial was read.
}
