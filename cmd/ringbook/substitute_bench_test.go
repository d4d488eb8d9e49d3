package main

import (
	"bufio"
	"fmt"
	"io"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"ringbook/acquire/simbench"
	"ringbook/snubber"
	"ringbook/store"
)

// seriesBench is a simulated bench with a folder that has its rig and its drawer.
type seriesBench struct {
	*simbench.Bench
	t   *testing.T
	dir string
}

// startBench serves a bench whose bus rises and falls so fast that a test can wait for it.
func startBench(t *testing.T) *seriesBench {
	cfg := simbench.Default()
	cfg.Bus.RiseS, cfg.Bus.DischargeS = 0.01, 0.01
	bench, err := simbench.Start(t.Context(), cfg)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(bench.Close)
	b := &seriesBench{bench, t, t.TempDir()}
	b.write("rig.toml", bench.RigTOML())
	b.write("relays.toml", bench.DrawerTOML())
	return b
}

func (b *seriesBench) write(name, text string) {
	b.t.Helper()
	if err := os.WriteFile(filepath.Join(b.dir, name), []byte(text), 0o644); err != nil {
		b.t.Fatal(err)
	}
}

// tell sends one of the bench's instruments a message, and gives the answer to a query.
func (b *seriesBench) tell(name, message string) string {
	b.t.Helper()
	conn, err := net.Dial("tcp", strings.TrimPrefix(b.Address(name), "tcp://"))
	if err != nil {
		b.t.Fatal(err)
	}
	defer conn.Close()
	conn.SetDeadline(time.Now().Add(10 * time.Second))
	fmt.Fprintf(conn, "%s\n*OPC?\n", message)
	r := bufio.NewReader(conn)
	line, err := r.ReadString('\n')
	if err == nil && strings.HasSuffix(message, "?") {
		_, err = r.ReadString('\n')
	}
	if err != nil {
		b.t.Fatalf("%s: %s: %v", name, message, err)
	}
	return strings.TrimSpace(line)
}

// isOff fails the test when the supply is on, or when a part was moved while the bus was live.
func (b *seriesBench) isOff() {
	b.t.Helper()
	if got := b.tell("supply", "OUTPut?"); got != "0" {
		b.t.Errorf("the supply's output is %s", got)
	}
	b.noMistake()
}

func (b *seriesBench) noMistake() {
	b.t.Helper()
	if m := b.Mistakes(); len(m) > 0 {
		b.t.Errorf("parts were moved on a live bus: %v", m)
	}
}

// program is this program as another process, in the bench's folder.
func (b *seriesBench) program(args ...string) *exec.Cmd {
	cmd := exec.CommandContext(b.t.Context(), os.Args[0])
	cmd.Args = append([]string{"ringbook"}, args...)
	cmd.Dir = b.dir
	cmd.Env = append(os.Environ(), "GORACE="+raceAtOnce)
	return cmd
}

// night is the series that nobody attends.
func night(revision string, more ...string) []string {
	return append([]string{"substitute", "--board", "w", "--revision", revision, "--session", "night", "--probe-c", "3p9", "--drawer", "relays.toml", "--unattended", "--all"}, more...)
}

// trialRow is a line that tells a person of a trial that is logged.
var trialRow = regexp.MustCompile(`^ *\d+  \S.* ([0-9a-f]{8})\n$`)

// acknowledged are the trials that whole lines of a program's output tell of, by the ends of their ids.
func acknowledged(r io.Reader) (ids []string) {
	lines := bufio.NewReader(r)
	for {
		line, err := lines.ReadString('\n')
		if m := trialRow.FindStringSubmatch(line); m != nil {
			ids = append(ids, m[1])
		}
		if err != nil {
			return ids
		}
	}
}

// trials are those of the logbook, each of them whole.
func (b *seriesBench) trials() []snubber.Trial {
	b.t.Helper()
	lb, err := store.Open(b.t.Context(), filepath.Join(b.dir, "ringbook.db"))
	if err != nil {
		b.t.Fatal(err)
	}
	defer lb.Close()
	var all []snubber.Trial
	for t, err := range lb.Trials(b.t.Context(), store.Scope{}) {
		if err != nil {
			b.t.Fatal(err)
		}
		if len(t.Readings) < 6 || t.Session == "" {
			b.t.Errorf("trial %s is not whole: %+v", t.ID, t)
		}
		all = append(all, t)
	}
	return all
}

// once sees that each trial acknowledged is there, and that no part was read twice in a revision.
func (b *seriesBench) once(told []string, trials []snubber.Trial) {
	b.t.Helper()
	byID, byPart := map[string]int{}, map[string]int{}
	for _, t := range trials {
		byID[store.ShortID(t.ID)]++
		byPart[t.Revision+" "+t.Part]++
	}
	for _, id := range told {
		if byID[id] != 1 {
			b.t.Errorf("trial %s was acknowledged and is there %d times", id, byID[id])
		}
	}
	for part, n := range byPart {
		if n > 1 {
			b.t.Errorf("part %s was read %d times", part, n)
		}
	}
}

// kills is how often a process is killed: RINGBOOK_KILLS, or few enough for an everyday test.
func kills(t *testing.T) int {
	n, err := strconv.Atoi(os.Getenv("RINGBOOK_KILLS"))
	if err != nil && os.Getenv("RINGBOOK_KILLS") != "" {
		t.Fatal(err)
	}
	if err != nil {
		return 4
	}
	return n
}

// written is what a program writes, for a test that waits for it.
type written struct {
	mu   sync.Mutex
	text strings.Builder
}

func (x *written) Write(p []byte) (int, error) {
	x.mu.Lock()
	defer x.mu.Unlock()
	return x.text.Write(p)
}

func (x *written) String() string {
	x.mu.Lock()
	defer x.mu.Unlock()
	return x.text.String()
}

// await waits until the program has written something so many times.
func (x *written) await(t *testing.T, text string, times int) {
	t.Helper()
	for range 600 {
		if strings.Count(x.String(), text) >= times {
			return
		}
		time.Sleep(20 * time.Millisecond)
	}
	t.Fatalf("%q did not come %d times in\n%s", text, times, x.String())
}
