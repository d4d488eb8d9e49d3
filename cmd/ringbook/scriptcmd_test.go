package main

import (
	"bytes"
	"compress/gzip"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
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

// capture FILE HZ DECAY_S NOISE_V STEP_V [SECOND_HZ] writes a capture of an edge from 0 V to 48 V that rings at HZ and dies in
// DECAY_S, with white noise, rounded to STEP_V (0: not), and with a second, weaker tone. HZ of 0 is an edge that does not ring,
// of -1 noise alone. A name that ends in .gz is gzipped.
func capture(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 5 || len(args) > 6 {
		ts.Fatalf("usage: capture file hz decay_s noise_v step_v [second_hz]")
	}
	x := [5]float64{}
	for i, s := range args[1:] {
		v, err := strconv.ParseFloat(s, 64)
		ts.Check(err)
		x[i] = v
	}
	hz, decay, noise, step := x[0], x[1], x[2], x[3]
	rng := rand.New(rand.NewPCG(5, uint64(len(args[0]))))
	var b strings.Builder
	b.WriteString("# a capture made up for this script\ntime_s,node_v\n")
	interval := decay / 400
	for i := -500; i < 3500; i++ {
		t := (float64(i) + 0.3) * interval
		v := 0.0
		switch {
		case hz < 0 || t < 0:
		case hz == 0:
			v = 48 * (1 - math.Exp(-t/decay*20))
		default:
			v = 48 - 40*math.Exp(-t/decay)*math.Cos(2*math.Pi*hz*t) - second(x[4], t, decay)
		}
		v += noise * rng.NormFloat64()
		if step > 0 {
			v = math.Round(v/step) * step
		}
		fmt.Fprintf(&b, "%.6e,%.6g\n", float64(i)*interval, v)
	}
	text := []byte(b.String())
	if strings.HasSuffix(args[0], ".gz") {
		var z bytes.Buffer
		w := gzip.NewWriter(&z)
		_, err := w.Write(text)
		ts.Check(err)
		ts.Check(w.Close())
		text = z.Bytes()
	}
	ts.Check(os.WriteFile(ts.MkAbs(args[0]), text, 0o644))
}

func second(hz, t, decay float64) float64 {
	if hz == 0 {
		return 0
	}
	return 8 * math.Exp(-t/decay*1.5) * math.Cos(2*math.Pi*hz*t)
}
