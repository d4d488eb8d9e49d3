package main

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"runtime"
	"strings"
	"testing"

	"ringbook/acquire"
)

// fence is a fenced block of a Markdown file.
type fence struct {
	line int    // of the file
	info string // what stands behind the opening fence
	text string
}

func fences(markdown string) []fence {
	var all []fence
	open := false
	for i, line := range strings.Split(markdown, "\n") {
		switch info, mark := strings.CutPrefix(line, "```"); {
		case mark && !open:
			all = append(all, fence{line: i + 1, info: info})
			open = true
		case mark:
			open = false
		case open:
			all[len(all)-1].text += line + "\n"
		}
	}
	return all
}

// step is one command of a block, with what it is to print.
type step struct {
	line          int
	command, want string
}

func steps(f fence) []step {
	var all []step
	for i, line := range strings.Split(strings.TrimSuffix(f.text, "\n"), "\n") {
		if command, ok := strings.CutPrefix(line, "$ "); ok {
			all = append(all, step{line: f.line + 1 + i, command: command})
		} else if len(all) > 0 {
			all[len(all)-1].want += line + "\n"
		}
	}
	return all
}

// fits compares output with what a block shows. "..." stands for any text in its line, and alone in a line for any
// lines.
func fits(want, got string) bool {
	var re strings.Builder
	re.WriteString(`\A`)
	for line := range strings.Lines(want) {
		if line == "...\n" {
			re.WriteString(`(?:.*\n)*`)
			continue
		}
		for i, part := range strings.Split(strings.TrimSuffix(line, "\n"), "...") {
			if i > 0 {
				re.WriteString(`.*`)
			}
			re.WriteString(regexp.QuoteMeta(part))
		}
		re.WriteString(`\n`)
	}
	re.WriteString(`\z`)
	return regexp.MustCompile(re.String()).MatchString(got)
}

// The README's commands are run one after another in one folder, in one shell, and print what it shows.
func TestReadme(t *testing.T) {
	if runtime.GOOS == "windows" {
		t.Skip("its commands are written for a POSIX shell")
	}
	text, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	var all []step
	rigs := 0
	for _, f := range fences(string(text)) {
		language, file, named := strings.Cut(f.info, " ")
		switch {
		case language == "toml" && !named:
			rigs++
			if _, err := acquire.ParseRig("README.md", []byte(f.text)); err != nil {
				t.Errorf("README.md:%d: %v", f.line, err)
			}
		case named:
			if err := os.WriteFile(filepath.Join(dir, file), []byte(f.text), 0o600); err != nil {
				t.Fatal(err)
			}
		default:
			all = append(all, steps(f)...)
		}
	}
	if len(all) < 10 || rigs == 0 {
		t.Fatalf("README.md has %d commands and %d rig files", len(all), rigs)
	}
	for i, got := range shell(t, dir, all) {
		if !fits(all[i].want, got) {
			t.Errorf("README.md:%d: $ %s\nprints\n%s\nwant\n%s", all[i].line, all[i].command, got, all[i].want)
		}
	}
}

// shell runs the commands in one shell and gives what each printed.
func shell(t *testing.T, dir string, all []step) []string {
	t.Helper()
	const mark = "\x1e" // between the output of one command and the next
	var script strings.Builder
	for _, s := range all {
		fmt.Fprintf(&script, "%s\n", s.command)
		if _, file, ok := strings.Cut(s.command, " > "); ok && strings.HasSuffix(file, " &") {
			// A person types the next command seconds later.
			fmt.Fprintf(&script, "behind=\"$behind $!\"\nwhile ! test -s %s; do sleep 0.05; done\n", strings.TrimSuffix(file, " &"))
		}
		fmt.Fprintf(&script, "printf '%s'\n", mark)
	}
	script.WriteString("kill $behind\nwait\n")
	cmd := exec.CommandContext(t.Context(), "sh", "-c", script.String())
	cmd.Dir = dir
	cmd.Env = append(os.Environ(), "COLUMNS=", "RINGBOOK_LOGBOOK=", "GORACE="+raceAtOnce)
	var out bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &out
	if err := cmd.Run(); err != nil {
		t.Fatalf("%v\n%s", err, &out)
	}
	parts := strings.Split(out.String(), mark)
	if len(parts) != len(all)+1 {
		t.Fatalf("%d commands and %d outputs:\n%s", len(all), len(parts)-1, &out)
	}
	return parts[:len(all)]
}

func TestFits(t *testing.T) {
	for _, c := range []struct {
		want, got string
		fits      bool
	}{
		{"a\n", "a\n", true},
		{"a\n", "b\n", false},
		{"a\n", "a\nb\n", false},
		{"", "a\n", false},
		{"...\n", "", true},
		{"...\nc\n", "a\nb\nc\n", true},
		{"...\nd\n", "a\nb\nc\n", false},
		{"L ... nH\n", "L 13.4 nH\n", true},
		{"L ... nH\n", "L 13.4 pF\n", false},
		{"a.c\n", "abc\n", false},
	} {
		if fits(c.want, c.got) != c.fits {
			t.Errorf("fits(%q, %q) is %v", c.want, c.got, !c.fits)
		}
	}
}

// The first thing a reader sees is the job in one paragraph, then the two commands, which the gate runs.
func TestReadmeBegins(t *testing.T) {
	text, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	parts := strings.SplitN(string(text), "\n\n", 4)
	if len(parts) < 4 || !strings.HasPrefix(parts[0], "# ringbook") || !strings.HasPrefix(parts[1], "ringbook is ") ||
		parts[2] != "    go run ./cmd/ringbook demo\n    go test ./..." {
		t.Errorf("README.md begins with %q", parts[:min(3, len(parts))])
	}
}
