// Package scipytest asks SciPy, a general-purpose reference library, for the answer a test compares with.
//
// It is for tests only. It runs Debian's Python (package python3-scipy); another interpreter may be named in
// RINGBOOK_PYTHON. Where SciPy is missing the test is skipped, unless RINGBOOK_CHECKS is "all": then it fails,
// so that the gate cannot pass without it.
package scipytest

import (
	"bytes"
	"encoding/json"
	"os"
	"os/exec"
	"testing"
)

// Run runs a Python script with in as JSON on its standard input and decodes its standard output, JSON, into
// out.
func Run(t testing.TB, script string, in, out any) {
	t.Helper()
	python := os.Getenv("RINGBOOK_PYTHON")
	if python == "" {
		python = "/usr/bin/python3"
	}
	if msg, err := exec.Command(python, "-c", "import scipy").CombinedOutput(); err != nil {
		if os.Getenv("RINGBOOK_CHECKS") == "all" {
			t.Fatalf("SciPy is needed for this check: install Debian's python3-scipy (%v: %s)", err, msg)
		}
		t.Skip("SciPy is not installed: Debian's python3-scipy has it")
	}
	text, err := json.Marshal(in)
	if err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command(python, script)
	cmd.Stdin = bytes.NewReader(text)
	var stderr bytes.Buffer
	cmd.Stderr = &stderr
	answer, err := cmd.Output()
	if err != nil {
		t.Fatalf("%s: %v\n%s", script, err, stderr.Bytes())
	}
	if err := json.Unmarshal(answer, out); err != nil {
		t.Fatalf("%s: %v in %.200q", script, err, answer)
	}
}
