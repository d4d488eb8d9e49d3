package recipes

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// folder are the names in a folder and what is in the files.
func folder(t *testing.T, dir string) map[string]string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	all := map[string]string{}
	for _, e := range entries {
		text := ""
		if !e.IsDir() {
			b, err := os.ReadFile(filepath.Join(dir, e.Name()))
			if err != nil {
				t.Fatal(err)
			}
			text = string(b)
		}
		all[e.Name()] = text
	}
	return all
}

func same(t *testing.T, when string, got, want map[string]string) {
	t.Helper()
	for name := range got {
		if _, ok := want[name]; !ok {
			t.Errorf("%s: there is %s", when, name)
		}
	}
	for name, text := range want {
		if got[name] != text {
			t.Errorf("%s: %s holds %.40q, want %.40q", when, name, got[name], text)
		}
	}
}

func TestWriteAll(t *testing.T) {
	dir := t.TempDir()
	at := func(name string) string { return filepath.Join(dir, name) }
	files := func(text string) []Content {
		return []Content{{at("a-1.svg"), []byte(text + " plot")}, {at("a.md"), []byte(text)}}
	}
	if err := WriteAll(files("old"), false); err != nil {
		t.Fatal(err)
	}
	old := map[string]string{"a-1.svg": "old plot", "a.md": "old"}
	same(t, "written", folder(t, dir), old)
	if err := WriteAll(files("new"), false); !errors.Is(err, ErrExists) {
		t.Errorf("over files that exist: %v", err)
	}
	same(t, "refused", folder(t, dir), old)
	if err := os.Chmod(at("a.md"), 0o640); err != nil {
		t.Fatal(err)
	}
	if err := WriteAll(files("new"), true); err != nil {
		t.Fatal(err)
	}
	same(t, "replaced", folder(t, dir), map[string]string{"a-1.svg": "new plot", "a.md": "new"})
	if info, err := os.Stat(at("a.md")); err != nil || info.Mode().Perm()&0o007 != 0 {
		t.Errorf("who may read it has changed: %v, %v", info.Mode(), err)
	}
}

// A name that is taken between staging and commit: what was placed before is taken back, what it replaced is put back.
func TestCommitIsAllOrNothing(t *testing.T) {
	for _, replace := range []bool{false, true} {
		dir := t.TempDir()
		at := func(name string) string { return filepath.Join(dir, name) }
		want := map[string]string{"b.md": "another's"}
		if replace {
			want["a.svg"] = "old"
			if err := os.WriteFile(at("a.svg"), []byte("old"), 0o600); err != nil {
				t.Fatal(err)
			}
		}
		var b batch
		for _, name := range []string{"a.svg", "new.svg", "b.md"} {
			if err := b.stage(at(name), Content{Text: []byte("new")}.write, replace); err != nil {
				t.Fatal(err)
			}
		}
		if replace { // a folder, over which no file can be renamed
			want["b.md"] = ""
			if err := os.Mkdir(at("b.md"), 0o700); err != nil {
				t.Fatal(err)
			}
		} else if err := os.WriteFile(at("b.md"), []byte(want["b.md"]), 0o600); err != nil {
			t.Fatal(err)
		}
		if err := b.commit(replace); err == nil || !replace && !errors.Is(err, ErrExists) {
			t.Errorf("replace %v: it commits over what stands there: %v", replace, err)
		}
		b.discard()
		same(t, "after a failed commit", folder(t, dir), want)
	}
}

// What cannot be written to its end is not there, and what stood there stays.
func TestWriteFile(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "a.csv")
	half := func(w io.Writer) error {
		_, err := io.WriteString(w, "half")
		return errors.Join(err, errors.New("the disk is full"))
	}
	for _, stands := range []string{"", "old"} {
		want := map[string]string{}
		if stands != "" {
			want["a.csv"] = stands
			if err := os.WriteFile(path, []byte(stands), 0o600); err != nil {
				t.Fatal(err)
			}
			if err := WriteFile(path, false, half); !errors.Is(err, ErrExists) {
				t.Errorf("over a file: %v", err)
			}
		}
		if err := WriteFile(path, true, half); err == nil || !strings.HasSuffix(err.Error(), "the disk is full; nothing was written") {
			t.Errorf("half written: %v", err)
		}
		same(t, "after a failure", folder(t, dir), want)
	}
	if err := WriteFile(path, true, Content{Text: []byte("new")}.write); err != nil {
		t.Error(err)
	}
	same(t, "replaced", folder(t, dir), map[string]string{"a.csv": "new"})
}

func TestFree(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "a.md")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if err := free(dir, true); err == nil {
		t.Error("a folder may be replaced")
	}
	if err := free(os.DevNull, true); err == nil {
		t.Error("a device may be replaced")
	}
	if err := free(file, false); !errors.Is(err, ErrExists) {
		t.Errorf("a file that exists: %v", err)
	}
	if err := errors.Join(free(file, true), free(filepath.Join(dir, "b.md"), false)); err != nil {
		t.Error(err)
	}
}
