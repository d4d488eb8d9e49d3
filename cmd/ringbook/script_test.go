package main

import (
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
)

// TestMain lets a script run this program as `ringbook`.
func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"ringbook": main})
}

// TestScripts runs testdata/script: commands, their files and what they are to print. The first words of a file's name
// are the command under test.
func TestScripts(t *testing.T) {
	testscript.Run(t, scripts(t, "testdata/script"))
}

func scripts(t *testing.T, dir string) testscript.Params {
	return testscript.Params{
		Dir:                 dir,
		RequireUniqueNames:  true,
		Deadline:            time.Now().Add(5 * time.Minute), // a program that hangs is stopped, with its stack
		RequireExplicitExec: true,
		Setup: func(env *testscript.Env) error {
			env.Setenv("TZ", "UTC") // --since and --until read days where the reader is
			env.Setenv("GORACE", raceAtOnce)
			env.Values[ctxKey{}] = t.Context()
			return nil
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"code": code, "json": jsonAt, "waitfor": waitFor,
			"instrument": instrument, "heldport": heldPort, "sql": sqlOn, "damage": damage, "capture": capture, "rows": rowsCSV, "boards": boardsCSV,
		},
	}
}

// raceAtOnce spares each run under the race detector the second it would sleep at its end.
const raceAtOnce = "atexit_sleep_ms=0"

// ctxKey finds the test's context in a script's values.
type ctxKey struct{}

// Each command has a script, and each script a command.
func TestEveryCommandHasAScript(t *testing.T) {
	files, err := filepath.Glob("testdata/script/*.txtar")
	if err != nil || len(files) == 0 {
		t.Fatalf("no script found (%v)", err)
	}
	tried := map[string]bool{}
	for _, c := range everyCommand() {
		if c.HasSubCommands() && c.HasParent() && !c.HasLocalFlags() { // it only holds others
			continue
		}
		name := strings.ReplaceAll(strings.TrimPrefix(c.CommandPath(), "ringbook "), " ", "_")
		found := false
		for _, f := range files {
			base := strings.TrimSuffix(filepath.Base(f), ".txtar")
			if base == name || strings.HasPrefix(base, name+"_") {
				tried[f], found = true, true
			}
		}
		if !found {
			t.Errorf("%s has no script", c.CommandPath())
		}
	}
	for _, f := range files {
		if !tried[f] {
			t.Errorf("%s names no command", f)
		}
	}
}

// A script can be made to fail: these would hide faults if they passed.
func TestOneSentence(t *testing.T) {
	for _, bad := range []string{
		"", "failed\n", "ringbook: fit: fit: no\n", "ringbook: strconv.ParseBool: no\n", "ringbook: no\nmore\n", "ringbook: [a <nil>]\n",
		"panic: x\n\ngoroutine 1\nringbook: x\n",
	} {
		if oneSentence(bad) == nil {
			t.Errorf("%q passes as one sentence", bad)
		}
	}
	for _, good := range []string{"ringbook: the cable: push it in\n", "reading\nringbook: no: a\n  b\n"} {
		if err := oneSentence(good); err != nil {
			t.Error(err)
		}
	}
}
