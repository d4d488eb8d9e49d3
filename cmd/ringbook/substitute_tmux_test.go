package main

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"
	"unicode/utf8"
)

// terminal is a terminal of 80 by 24 that tmux makes, on a server of its own.
type terminal struct {
	t      *testing.T
	server string
}

func openTerminal(t *testing.T, dir, command string) *terminal {
	if _, err := exec.LookPath("tmux"); err != nil {
		t.Skip("it needs tmux")
	}
	x := &terminal{t, fmt.Sprintf("ringbook-test-%d", os.Getpid())}
	x.tmux("-f", "/dev/null", "new-session", "-d", "-x", "80", "-y", "24", "-c", dir, command)
	t.Cleanup(func() { exec.Command("tmux", "-L", x.server, "kill-server").Run() })
	return x
}

func (x *terminal) tmux(args ...string) string {
	x.t.Helper()
	out, err := exec.CommandContext(x.t.Context(), "tmux", append([]string{"-L", x.server}, args...)...).CombinedOutput()
	if err != nil {
		x.t.Fatalf("tmux %v: %v: %s", args, err, out)
	}
	return string(out)
}

// lines are all that was shown, lines that were too long in one piece.
func (x *terminal) lines() []string {
	return strings.Split(strings.TrimRight(x.tmux("capture-pane", "-p", "-J", "-S", "-"), "\n "), "\n")
}

// TestSubstituteInTmux leads through a whole series in a terminal, while three things go wrong: every trial that the screen
// told of is in the logbook, once.
func TestSubstituteInTmux(t *testing.T) {
	b := startBench(t)
	program := filepath.Join(b.dir, "ringbook")
	if err := os.Symlink(os.Args[0], program); err != nil {
		t.Fatal(err)
	}
	x := openTerminal(t, b.dir, "env GORACE="+raceAtOnce+" ./ringbook substitute --board w --revision A --session s --probe-c 3p9 --c-tol 5%; echo exit code $?; sleep 600")
	troubles := map[int]string{2: "DROP SCOPE,4", 3: "STALe COUNTER", 4: "DROP SUPPLY,2,0.5"}
	answers := map[int]string{2: "470p", 3: "220p", 4: "1n", 5: "again"}
	answered, ended := 0, false
	var lines []string
	for begun := time.Now(); !ended && time.Since(begun) < time.Minute; time.Sleep(50 * time.Millisecond) {
		lines = x.lines()
		asked := 0
		for _, line := range lines {
			if strings.HasPrefix(line, ">") {
				asked++
			}
		}
		last := lines[len(lines)-1]
		ended = last == "exit code 0"
		if asked == answered+1 && strings.TrimSpace(last) == ">" {
			answered++
			if trouble, ok := troubles[answered]; ok {
				b.tell("trouble", "TROuble:"+trouble)
			}
			x.tmux("send-keys", answers[answered], "Enter")
		}
	}
	shown := strings.Join(lines, "\n")
	if !ended {
		t.Fatalf("the series did not end:\n%s", shown)
	}
	told := acknowledged(strings.NewReader(shown))
	trials := b.trials()
	ids := map[string]bool{}
	for _, id := range told {
		ids[id] = true
	}
	if len(told) != len(trials) || len(ids) != len(trials) || len(trials) < 5 {
		t.Errorf("%d trials were shown and %d are logged\n%s", len(told), len(trials), shown)
	}
	b.isOff()
	for _, name := range []string{"scope", "counter", "supply"} {
		if happened, waiting := b.Troubles(name); happened != 1 || waiting != 0 {
			t.Errorf("%d troubles happened to the %s, %d did not", happened, name, waiting)
		}
	}
	for _, line := range lines {
		if utf8.RuneCountInString(line) > 80 {
			t.Errorf("a line is longer than the screen: %q", line)
		}
	}
	if os.Getenv("RINGBOOK_SHOW") != "" {
		t.Log(shown)
	}
}
