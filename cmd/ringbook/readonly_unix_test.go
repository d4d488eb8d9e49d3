//go:build unix

package main

import (
	"bytes"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// A logbook that is write-protected is read as before; logging to it fails with the cure, and leaves it alone. Nothing
// is protected from root, so the program then runs as a user who owns nothing.
func TestReadOnlyLogbook(t *testing.T) {
	dir, err := os.MkdirTemp("", "readonly") // t.TempDir cannot be entered by others
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(dir) })
	program := filepath.Join(dir, "ringbook")
	if out, err := exec.Command("go", "build", "-o", program, ".").CombinedOutput(); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	folder := filepath.Join(dir, "bench")
	logbook := filepath.Join(folder, "ringbook.db")
	enter := []string{"trial", "enter", "--board", "winch-drive", "--revision", "B", "--network", "bare", "--ring-hz", "88MHz", "--logbook", logbook}
	if err := os.Mkdir(folder, 0o755); err != nil {
		t.Fatal(err)
	}
	answer(t, nil, enter...)
	for _, x := range [][]string{{"bare", "98.77", "87.77e6"}, {"c", "94.68", "74.18e6", "--c", "100p"}, {"c", "88.14", "51.8e6", "--c", "470p"}, {"c", "77.92", "27.35e6", "--c", "2n2"}} {
		answer(t, nil, append([]string{"trial", "enter", "--board", "winch-drive", "--revision", "B", "--network", x[0], "--peak-v", x[1], "--ring-hz", x[2],
			"--bus-v", "48V", "--switching-hz", "400k", "--logbook", logbook}, x[3:]...)...)
	}
	for path, mode := range map[string]os.FileMode{logbook: 0o444, folder: 0o555, dir: 0o755} {
		if err := os.Chmod(path, mode); err != nil {
			t.Fatal(err)
		}
	}
	before, err := os.ReadFile(logbook)
	if err != nil {
		t.Fatal(err)
	}
	call := func(args ...string) (int, string) {
		cmd := exec.Command(program, args...)
		cmd.Dir = "/"
		if os.Getuid() == 0 {
			cmd.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: 65534, Gid: 65534}}
		}
		out, err := cmd.CombinedOutput()
		var exit *exec.ExitError
		if err != nil && !errors.As(err, &exit) {
			t.Fatal(err)
		}
		return cmd.ProcessState.ExitCode(), string(out)
	}
	for _, args := range [][]string{
		enter, {"board", "add", "tide-gate", "--logbook", logbook}, {"trial", "strike", "00000000", "--because", "x", "--logbook", logbook},
		{"demo", "--quiet", "--logbook", logbook},
	} {
		code, told := call(args...)
		if err := oneSentence(told); code != 1 || err != nil || !strings.Contains(told, "read-only; make") {
			t.Errorf("ringbook %s: exit code %d, %v: %s", strings.Join(args, " "), code, err, told)
		}
	}
	if code, told := call("history", "--logbook", logbook); code != 0 || !strings.Contains(told, "winch-drive") {
		t.Errorf("reading it: exit code %d: %s", code, told)
	}
	// A recommendation needs no writing: it answers, and warns that nothing holds it.
	code, told := call("recommend", "--max-peak", "80V", "--json", "--logbook", logbook)
	if code != 0 || !strings.Contains(told, `"met": true`) || !strings.Contains(told, `"decision": null`) || !strings.Contains(told, "the decision is not logged") {
		t.Errorf("recommending from it: exit code %d: %s", code, told)
	}
	if code, told := call("confirm", "--logbook", logbook); code != 1 || !strings.Contains(told, "no decision is logged for winch-drive B") {
		t.Errorf("confirming from it: exit code %d: %s", code, told)
	}
	after, err := os.ReadFile(logbook)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(before, after) {
		t.Error("the logbook has changed")
	}
}
