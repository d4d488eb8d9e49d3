//go:build unix

package recipes

import (
	"errors"
	"os"
	"os/exec"
	"os/signal"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"
)

// TestDiskFull lets the system's bound on a file's size stand for the disk's: a write stops halfway and fails.
func TestDiskFull(t *testing.T) {
	dir := t.TempDir()
	at := func(name string) string { return filepath.Join(dir, name) }
	if err := os.WriteFile(at("a.md"), []byte("old"), 0o600); err != nil {
		t.Fatal(err)
	}
	var usual syscall.Rlimit
	if err := syscall.Getrlimit(syscall.RLIMIT_FSIZE, &usual); err != nil {
		t.Fatal(err)
	}
	signal.Ignore(syscall.SIGXFSZ)
	defer signal.Reset(syscall.SIGXFSZ)
	tight := usual
	tight.Cur = 64 << 10
	if err := syscall.Setrlimit(syscall.RLIMIT_FSIZE, &tight); err != nil {
		t.Fatal(err)
	}
	defer syscall.Setrlimit(syscall.RLIMIT_FSIZE, &usual)
	large := []byte(strings.Repeat("x", 100<<10))
	for _, files := range [][]Content{
		{{at("a-1.svg"), []byte("plot")}, {at("a.md"), large}},
		{{at("a-1.svg"), large}, {at("a.md"), []byte("new")}},
	} {
		err := WriteAll(files, true)
		if !errors.Is(err, syscall.EFBIG) || !strings.HasSuffix(err.Error(), ": file too large; nothing was written") || strings.Contains(err.Error(), "part") {
			t.Errorf("on a full disk: %v", err)
		}
		same(t, "after a full disk", folder(t, dir), map[string]string{"a.md": "old"})
	}
}

// writerFolder names the folder in which the test binary, run again, writes files until it is killed.
const writerFolder = "RINGBOOK_TEST_WRITER_FOLDER"

func killed(dir string) []Content {
	var files []Content
	for _, name := range []string{"a-1.svg", "a-2.svg", "a.md"} {
		files = append(files, Content{Path: filepath.Join(dir, name)})
	}
	return files
}

func TestWriterToBeKilled(t *testing.T) {
	dir := os.Getenv(writerFolder)
	if dir == "" {
		return // it is TestKilled that runs this
	}
	for text := 'a'; ; text = 'a' + (text+1-'a')%26 {
		files := killed(dir)
		for i := range files {
			files[i].Text = []byte(strings.Repeat(string(text), 300<<10))
		}
		if err := WriteAll(files, true); err != nil {
			t.Fatal(err)
		}
	}
}

// TestKilled kills a program while it replaces files: each is whole, the old one or the new.
func TestKilled(t *testing.T) {
	for kill := range 12 {
		dir := t.TempDir()
		cmd := exec.CommandContext(t.Context(), os.Args[0], "-test.run=^TestWriterToBeKilled$")
		cmd.Env = append(os.Environ(), writerFolder+"="+dir)
		if err := cmd.Start(); err != nil {
			t.Fatal(err)
		}
		last := killed(dir)[2].Path
		for deadline := time.Now().Add(20 * time.Second); ; time.Sleep(time.Millisecond) {
			if _, err := os.Stat(last); err == nil {
				break
			}
			if time.Now().After(deadline) {
				t.Fatal("nothing is written")
			}
		}
		time.Sleep(time.Duration(kill) * 3 * time.Millisecond)
		if err := cmd.Process.Kill(); err != nil {
			t.Fatal(err)
		}
		cmd.Wait() // it says that it was killed
		for _, f := range killed(dir) {
			text, err := os.ReadFile(f.Path)
			if err != nil {
				t.Fatal(err)
			}
			if len(text) != 300<<10 || strings.Trim(string(text), string(text[:1])) != "" {
				t.Errorf("%s holds %d bytes, %.1q to %.1q", filepath.Base(f.Path), len(text), text, text[max(0, len(text)-1):])
			}
		}
	}
}
