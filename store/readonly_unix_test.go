//go:build unix

package store

import (
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// TestReadOnly looks at write-protected files and folders as a user they do not belong to: as root, nothing is protected.
func TestReadOnly(t *testing.T) {
	root, err := os.MkdirTemp("", "readonly")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(root) })
	if err := os.Chmod(root, 0o755); err != nil {
		t.Fatal(err)
	}
	program := filepath.Join(root, "program")
	data, err := os.ReadFile(os.Args[0])
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(program, data, 0o755); err != nil {
		t.Fatal(err)
	}
	asNobody := func(path, work string) string {
		cmd := exec.Command(program)
		cmd.Dir = "/"
		cmd.Env = append(os.Environ(), childFile+"="+path, childWork+"="+work)
		if os.Getuid() == 0 {
			cmd.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: 65534, Gid: 65534}}
		}
		out, _ := cmd.CombinedOutput()
		return strings.TrimSpace(string(out))
	}
	for _, c := range []struct {
		name         string
		folder, file os.FileMode
		open, read   string
	}{
		{"both writable", 0o777, 0o666, "", "3 trials"},
		{"file read-only", 0o777, 0o444, "ead-only; make", "3 trials"},
		{"folder read-only", 0o555, 0o666, "ead-only; make", "3 trials"},
		{"both read-only", 0o555, 0o444, "ead-only; make", "3 trials"},
		{"file not readable", 0o755, 0o000, "may write", "may write"},
		{"no file, folder read-only", 0o555, 0, "cannot be opened", "no logbook in that place"},
	} {
		t.Run(c.name, func(t *testing.T) {
			folder := filepath.Join(root, strings.ReplaceAll(c.name, " ", "_"))
			if err := os.Mkdir(folder, 0o777); err != nil {
				t.Fatal(err)
			}
			path := filepath.Join(folder, "ringbook.db")
			if !strings.HasPrefix(c.name, "no file") {
				lb, err := Open(t.Context(), path)
				if err != nil {
					t.Fatal(err)
				}
				if _, err := lb.AddAll(t.Context(), many(3), nil); err != nil {
					t.Fatal(err)
				}
				lb.Close()
				if err := os.Chmod(path, c.file); err != nil {
					t.Fatal(err)
				}
			}
			if err := os.Chmod(folder, c.folder); err != nil {
				t.Fatal(err)
			}
			for work, want := range map[string]string{"look": c.open, "read": c.read} {
				got := asNobody(path, work)
				if (want == "") != (got == "") || !strings.Contains(got, want) || strings.Contains(got, "\n") {
					t.Errorf("%s: %q; want %q", work, got, want)
				}
			}
		})
	}
}
