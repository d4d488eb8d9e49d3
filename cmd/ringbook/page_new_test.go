package main

import (
	"bytes"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"ringbook/store"
)

// TestPageOfOnesOwn begins a recipe in a folder outside this program's source and runs it with the go tool, with no network:
// it prints its page, and writes the same one twice.
func TestPageOfOnesOwn(t *testing.T) {
	if _, err := exec.LookPath("go"); err != nil {
		if os.Getenv("RINGBOOK_CHECKS") == "all" {
			t.Fatal(err)
		}
		t.Skip(err)
	}
	dir := filepath.Join(t.TempDir(), "a folder's own (copy)")
	logbook := filepath.Join(t.TempDir(), "ringbook.db")
	trials, err := os.Open("testdata/peaks.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer trials.Close()
	lb, err := store.Open(t.Context(), logbook)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := lb.AddAll(t.Context(), store.ReadCSV(trials), nil); err != nil {
		t.Fatal(err)
	}
	if err := lb.Close(); err != nil {
		t.Fatal(err)
	}
	var said bytes.Buffer
	if err := run(t.Context(), []string{"page", "new", "peaks", "--dir", dir, "--logbook", logbook}, strings.NewReader(""), &said, io.Discard); err != nil {
		t.Fatal(err)
	}
	goRun := func(want int, args ...string) (stdout, stderr string) {
		t.Helper()
		cmd := exec.CommandContext(t.Context(), "go", append([]string{"run", "."}, args...)...)
		cmd.Dir = dir
		cmd.Env = append(os.Environ(), "GOPROXY=off", "GOFLAGS=-mod=readonly", "GOWORK=off")
		var out, errs bytes.Buffer
		cmd.Stdout, cmd.Stderr = &out, &errs
		err := cmd.Run()
		// go run says "exit status N" of the program's, and exits with 1 itself.
		if (err != nil) != (want != 0) || want > 1 && !strings.Contains(errs.String(), "exit status 2") {
			t.Fatalf("go run . %q: %v\n%s", args, err, errs.String())
		}
		return out.String(), errs.String()
	}
	page, _ := goRun(0, "-logbook", logbook)
	for _, want := range []string{"Ring of winch-drive B\n", "100p  74.18(13)\n", "loop inductance ", "Plot: The ring slows", "**", "Digest of the rows used"} {
		if strings.Contains(page, want) != (want != "**") {
			t.Errorf("%q: %v in the page:\n%s", want, want == "**", page)
		}
	}
	goRun(0, "-logbook", logbook, "-o", "page.html")
	goRun(0, "-logbook", logbook, "-board", "winch-drive", "-revision", "B", "-o", "again.html")
	first, err := os.ReadFile(filepath.Join(dir, "page.html"))
	if err != nil {
		t.Fatal(err)
	}
	again, err := os.ReadFile(filepath.Join(dir, "again.html"))
	if err != nil || !bytes.Equal(first, again) {
		t.Errorf("written twice, the page differs (%v)", err)
	}
	if !bytes.Contains(first, []byte("<svg")) || bytes.Contains(first, []byte(dir)) {
		t.Error("the page has no plot, or a path of this computer")
	}
	if _, errs := goRun(1, "-logbook", logbook, "-o", "page.html"); !strings.Contains(errs, "replace it with --force") {
		t.Errorf("where the file exists: %s", errs)
	}
	if _, errs := goRun(1, "-logbook", logbook, "-board", "mill"); !strings.Contains(errs, `holds no trial of board "mill"`) {
		t.Errorf("of a board there is not: %s", errs)
	}
	goRun(2, "-logbook", logbook, "-o", "page.pdf")

	// It is formatted, and the go tool finds go.mod complete and needs to change nothing.
	mod := exec.CommandContext(t.Context(), "gofmt", "-l", ".")
	mod.Dir = dir
	if out, err := mod.CombinedOutput(); err != nil || len(out) > 0 {
		t.Errorf("gofmt: %v %s", err, out)
	}
	names, err := filepath.Glob(filepath.Join(dir, "*"))
	if err != nil {
		t.Fatal(err)
	}
	for i := range names {
		names[i] = filepath.Base(names[i])
	}
	if want := []string{"again.html", "go.mod", "go.sum", "page.html", "peaks.go"}; !slices.Equal(names, want) {
		t.Errorf("the folder has %q, want %q", names, want)
	}
}

// A source that lies under an odd name can be written in go.mod.
func TestModuleOf(t *testing.T) {
	mod := []byte("module ringbook\n\ngo 1.26.0\n\nrequire example.invalid/x v1.0.0\n")
	for checkout, want := range map[string]string{
		"/home/a/ringbook":    "replace ringbook => /home/a/ringbook\n",
		"/home/a b/ring,book": `replace ringbook => "/home/a b/ring,book"` + "\n",
		`C:\src\ringbook`:     `replace ringbook => C:\src\ringbook` + "\n",
	} {
		got := string(moduleOf("peaks", checkout, mod))
		if !strings.HasPrefix(got, "module notebook/peaks\n\ngo 1.26.0\n\nrequire example.invalid/x v1.0.0\n\nrequire ringbook v0.0.0\n") || !strings.HasSuffix(got, want) {
			t.Errorf("%s: %s", checkout, got)
		}
	}
}
