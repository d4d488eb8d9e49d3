package main

import (
	"bytes"
	"context"
	"flag"
	"os"
	"path/filepath"
	"testing"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/store"
)

// -pages writes the demonstration's pages anew: after a change of the recipes, look at them, then at the difference. The
// logbook itself is what `ringbook demo` left; a new one takes -pages as well.
var writePages = flag.Bool("pages", false, "write testdata/pages anew from its logbook")

// The pages of a demonstration's logbook are the same to the byte on any day and machine.
func TestDemoPages(t *testing.T) {
	lb := demoLogbook(t)
	for _, r := range recipes.All() {
		woven := demoPage(t, lb, r)
		for _, form := range []struct {
			ending string
			write  func(*bytes.Buffer) error
		}{
			{".html", func(b *bytes.Buffer) error { return woven.HTML(b) }},
			{".txt", func(b *bytes.Buffer) error { return woven.Text(b, page.TextOptions{Prose: true}) }},
		} {
			var got bytes.Buffer
			if err := form.write(&got); err != nil {
				t.Errorf("%s: %v", r.Name, err)
				continue
			}
			golden := filepath.Join("testdata", "pages", r.Name+form.ending)
			if *writePages {
				if err := os.WriteFile(golden, got.Bytes(), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(golden)
			if err != nil {
				t.Fatal(err)
			}
			if !bytes.Equal(got.Bytes(), want) {
				t.Errorf("%s is not what the recipe gives now%s; run with -pages, and look at what changed", golden, firstChange(want, got.Bytes()))
			}
		}
	}
}

// demoLogbook opens a copy of the logbook that a demonstration left.
func demoLogbook(t testing.TB) *store.Logbook {
	t.Helper()
	path := filepath.Join(t.TempDir(), "demo.db")
	data, err := os.ReadFile(filepath.Join("testdata", "pages", "demo.sqlite"))
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, data, 0o644); err != nil {
		t.Fatal(err)
	}
	lb, err := store.OpenReadOnly(context.Background(), path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { lb.Close() })
	return lb
}

// demoPage weaves a recipe from it, as the demonstration does.
func demoPage(t testing.TB, lb *store.Logbook, r recipes.Recipe) *recipes.Woven {
	t.Helper()
	src := recipes.Source{Logbook: lb, Scope: store.Scope{Board: demoBoard, Revision: demoRevision},
		Limits: recipes.Request{Limits: snubber.Limits{CTol: demoCTol, RTol: demoRTol}}}
	if !r.Single {
		src.Scope.Revision = ""
	}
	woven, err := r.Page(context.Background(), src)
	if err != nil {
		t.Fatalf("%s: %v", r.Name, err)
	}
	return woven
}

// firstChange quotes the first line that differs.
func firstChange(want, got []byte) string {
	a, b := bytes.Split(want, []byte("\n")), bytes.Split(got, []byte("\n"))
	for i := range min(len(a), len(b)) {
		if !bytes.Equal(a[i], b[i]) {
			return ": " + string(a[i][:min(len(a[i]), 200)]) + "\n\tnow " + string(b[i][:min(len(b[i]), 200)])
		}
	}
	return ""
}
