package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"regexp"
	"strconv"
	"strings"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
)

// code N PROGRAM [ARGS...] runs a program and wants exit code N. Where this program failed (1) or was called wrongly
// (2) it has to say so in one sentence that reads well.
func code(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: code N program [args...]")
	}
	err := ts.Exec(args[1], args[2:]...)
	got := 0
	var exit *exec.ExitError
	if errors.As(err, &exit) {
		got = exit.ExitCode()
	} else if err != nil {
		ts.Fatalf("%v", err)
	}
	if strconv.Itoa(got) != args[0] {
		ts.Fatalf("exit code %d, want %s", got, args[0])
	}
	if got == 1 || got == 2 {
		ts.Check(oneSentence(ts.ReadFile("stderr")))
	}
}

// oneSentence looks at the end of what a failed command wrote: one line, of this program, that says nothing twice and
// shows nothing of the language it is written in. Lines set in below it are the list of a file's bad rows.
func oneSentence(stderr string) error {
	lines := strings.Split(strings.TrimRight(stderr, "\n"), "\n")
	for len(lines) > 1 && strings.HasPrefix(lines[len(lines)-1], "  ") {
		lines = lines[:len(lines)-1]
	}
	last := lines[len(lines)-1]
	told, ours := strings.CutPrefix(last, "ringbook: ")
	switch {
	case !ours:
		return fmt.Errorf("the last line does not begin with the program's name: %q", last)
	case strings.Contains(stderr, "panic"), strings.Contains(stderr, "goroutine"):
		return fmt.Errorf("a panic: %q", stderr)
	}
	for _, noise := range []string{"strconv.", "%!", "<nil>", "map[", "context ", "EOF", "syscall"} {
		if strings.Contains(told, noise) {
			return fmt.Errorf("%q shows in %q", noise, last)
		}
	}
	seen := map[string]bool{}
	for _, part := range strings.Split(told, ": ") {
		if seen[part] {
			return fmt.Errorf("%q stands twice in %q", part, last)
		}
		seen[part] = true
	}
	return nil
}

// json FILE PATH WANT reads FILE (or stdout), which must be one JSON object and nothing else, and compares what PATH
// leads to. A path is keys and list indexes with dots between; len is a list's length. WANT is a text, /a regular
// expression/, or LOW..HIGH for a number between the two. With ! the comparison must fail.
func jsonAt(ts *testscript.TestScript, neg bool, args []string) {
	if len(args) != 3 {
		ts.Fatalf("usage: json file path want")
	}
	got, err := valueAt(ts.ReadFile(args[0]), args[1])
	ts.Check(err)
	same, err := matches(got, args[2])
	ts.Check(err)
	if same == neg {
		ts.Fatalf("%s is %s, which is %v for %s", args[1], got, same, args[2])
	}
}

func valueAt(text, path string) (string, error) {
	dec := json.NewDecoder(strings.NewReader(text))
	dec.UseNumber()
	var object map[string]any
	if err := dec.Decode(&object); err != nil {
		return "", fmt.Errorf("no JSON object: %w", err)
	}
	if _, err := dec.Token(); err != io.EOF {
		return "", fmt.Errorf("something follows the JSON object")
	}
	var at any = object
	for key := range strings.SplitSeq(path, ".") {
		switch x := at.(type) {
		case map[string]any:
			v, ok := x[key]
			if !ok {
				return "", fmt.Errorf("no %q on the way to %q in %v", key, path, x)
			}
			at = v
		case []any:
			if key == "len" {
				at = len(x)
				continue
			}
			i, err := strconv.Atoi(key)
			if err != nil || i < 0 || i >= len(x) {
				return "", fmt.Errorf("no item %q on the way to %q, in a list of %d", key, path, len(x))
			}
			at = x[i]
		default:
			return "", fmt.Errorf("%q on the way to %q is asked of %v", key, path, x)
		}
	}
	if at == nil {
		return "null", nil
	}
	if _, nested := at.(map[string]any); nested {
		return "object", nil
	}
	return fmt.Sprint(at), nil
}

func matches(got, want string) (bool, error) {
	if low, high, ok := strings.Cut(want, ".."); ok {
		var v [3]float64
		for i, s := range []string{low, got, high} {
			var err error
			if v[i], err = strconv.ParseFloat(s, 64); err != nil {
				return false, fmt.Errorf("%q is no number", s)
			}
		}
		return v[0] <= v[1] && v[1] <= v[2], nil
	}
	if len(want) > 1 && want[0] == '/' && want[len(want)-1] == '/' {
		re, err := regexp.Compile(want[1 : len(want)-1])
		if err != nil {
			return false, err
		}
		return re.MatchString(got), nil
	}
	return got == want, nil
}

// waitfor FILE REGEXP waits until a file that another program writes has such a line.
func waitFor(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: waitfor file regexp")
	}
	re, err := regexp.Compile("(?m)" + args[1])
	ts.Check(err)
	var text []byte
	for range 600 {
		if text, _ = os.ReadFile(ts.MkAbs(args[0])); re.Match(text) {
			return
		}
		time.Sleep(50 * time.Millisecond)
	}
	ts.Fatalf("%s has no %q after half a minute: %q", args[0], args[1], text)
}
