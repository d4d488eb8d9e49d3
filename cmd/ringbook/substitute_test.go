package main

import (
	"context"
	"io"
	"math/rand/v2"
	"os"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// TestSubstituteKilled kills a series at a random moment, again and again, and begins it anew each time. No trial that was
// acknowledged is lost, none is doubled, and the series comes to its end.
func TestSubstituteKilled(t *testing.T) {
	b := startBench(t)
	var told []string
	n, revision, ended, killed := kills(t), 1, 0, 0
	for killed < n {
		cmd := b.program(night(strconv.Itoa(revision))...)
		stderr, err := cmd.StderrPipe()
		if err != nil {
			t.Fatal(err)
		}
		if err := cmd.Start(); err != nil {
			t.Fatal(err)
		}
		timer := time.AfterFunc(time.Duration(rand.IntN(2000))*time.Millisecond, func() { cmd.Process.Kill() })
		told = append(told, acknowledged(stderr)...)
		err = cmd.Wait()
		timer.Stop()
		switch code := cmd.ProcessState.ExitCode(); code {
		case 0:
			ended++
			revision++
		case -1:
			killed++
		default:
			t.Fatalf("exit code %d, %v", code, err)
		}
		b.once(told, b.trials())
	}
	cmd := b.program(night(strconv.Itoa(revision), "--quiet", "--json")...)
	if out, err := cmd.Output(); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	trials := b.trials()
	b.once(told, trials)
	b.isOff()
	of := map[string]int{}
	for _, t := range trials {
		of[t.Revision]++
	}
	for r := 1; r <= revision; r++ {
		if of[strconv.Itoa(r)] != 51 {
			t.Errorf("series %d came to %d trials: fifty capacitors and the bare node are 51", r, of[strconv.Itoa(r)])
		}
	}
	if len(told) == 0 {
		t.Error("no trial was acknowledged in any round: nothing was tested")
	}
	t.Logf("killed %d times: %d trials acknowledged, %d logged, %d series ended", killed, len(told), len(trials), ended+1)
}

// TestSubstituteInterrupted stops a series at a random moment in each of the ways there are: the supply is off after it.
func TestSubstituteInterrupted(t *testing.T) {
	b := startBench(t)
	for i, signals := range [][]os.Signal{{os.Interrupt}, {syscall.SIGTERM}, {syscall.SIGHUP}, {os.Interrupt, os.Interrupt, syscall.SIGTERM}, {os.Interrupt}} {
		cmd := b.program(night("A")...)
		seen := &written{}
		cmd.Stderr = seen
		if err := cmd.Start(); err != nil {
			t.Fatal(err)
		}
		seen.await(t, "Supply on.", 1)
		time.Sleep(time.Duration(rand.IntN(400)) * time.Millisecond)
		for _, s := range signals {
			cmd.Process.Signal(s)
			time.Sleep(time.Millisecond)
		}
		cmd.Wait()
		text := seen.String()
		if code := cmd.ProcessState.ExitCode(); code != 1 || !strings.Contains(text, "interrupted; what was logged before stands") {
			t.Errorf("%d, %v: exit code %d\n%s", i, signals, code, text)
		}
		if !strings.HasSuffix(strings.SplitN(text, "Of this run", 2)[0], "Supply off.\n") {
			t.Errorf("%d, %v: the last words are\n%s", i, signals, text)
		}
		b.isOff()
		b.once(acknowledged(strings.NewReader(text)), b.trials())
	}
}

// TestSubstituteUnseen closes what the program writes to: it does not die of that with the supply on.
func TestSubstituteUnseen(t *testing.T) {
	b := startBench(t)
	cmd := b.program(night("A")...)
	stderr, err := cmd.StderrPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	some := make([]byte, 500)
	io.ReadFull(stderr, some)
	stderr.Close()
	time.Sleep(2 * time.Second) // a few trials
	if n := len(b.trials()); n < 3 {
		t.Errorf("%d trials were logged", n)
	}
	cmd.Process.Signal(syscall.SIGTERM)
	cmd.Wait()
	b.isOff()
}

// TestSubstituteTypedEarly presses Enter before anything is asked: no part is taken as fitted for that.
func TestSubstituteTypedEarly(t *testing.T) {
	b := startBench(t)
	t.Chdir(b.dir)
	stdin, keys := io.Pipe()
	defer keys.Close()
	seen := &written{}
	done := make(chan error, 1)
	go func() {
		done <- run(t.Context(), []string{"substitute", "--board", "w", "--revision", "A", "--session", "s", "--probe-c", "3p9", "--c-tol", "5%"}, stdin, io.Discard, seen)
	}()
	io.WriteString(keys, "\n\n1n\n")
	seen.await(t, "> ", 1)
	if !strings.Contains(seen.String(), "typed before the question") {
		t.Error("nothing is said of what was typed early")
	}
	time.Sleep(300 * time.Millisecond)
	if strings.Contains(seen.String(), "Supply on") {
		t.Errorf("keys pressed early were taken as an answer:\n%s", seen)
	}
	io.WriteString(keys, "\n")
	seen.await(t, "Reading bare", 1)
	io.WriteString(keys, "\n\n") // while it reads
	seen.await(t, "> ", 2)
	time.Sleep(300 * time.Millisecond)
	if strings.Count(seen.String(), "Supply on") != 1 {
		t.Errorf("keys pressed while it read were taken as an answer:\n%s", seen)
	}
	io.WriteString(keys, "4u7q\n")
	seen.await(t, "Not understood: ", 1)
	io.WriteString(keys, "done\n")
	if err := <-done; err != nil {
		t.Error(err)
	}
	b.isOff()
	if n := len(b.trials()); n != 1 {
		t.Errorf("%d trials are logged", n)
	}
}

// TestSubstituteFaults lets instruments fail in the middle of a series that nobody attends.
func TestSubstituteFaults(t *testing.T) {
	b := startBench(t)
	t.Chdir(b.dir)
	ctx, cancel := context.WithTimeout(t.Context(), 2*time.Minute)
	defer cancel()
	seen := &written{}
	done := make(chan error, 1)
	go func() { done <- run(ctx, night("A"), strings.NewReader(""), io.Discard, seen) }()
	for i, trouble := range []string{"DROP SCOPE,4", "STALe COUNTER", "DROP SUPPLY,2,0.5", "LINE SUPPLY,'READY'", "DROP RELAYS", "CUT SCOPE,3", "GARBage FIXTURE,1"} {
		seen.await(t, "Supply on.", 3*i+2)
		b.tell("trouble", "TROuble:"+trouble)
	}
	err := <-done
	told := acknowledged(strings.NewReader(seen.String()))
	b.once(told, b.trials())
	b.isOff()
	if err != nil || len(told) != 51 {
		t.Errorf("%d trials were acknowledged, %v\n%s", len(told), err, seen)
	}
	for _, name := range []string{"scope", "counter", "supply", "relays", "fixture"} {
		if happened, waiting := b.Troubles(name); happened == 0 || waiting > 0 {
			t.Errorf("%d troubles happened to the %s, %d did not", happened, name, waiting)
		}
	}
	for _, trial := range b.trials() {
		for _, r := range trial.Readings {
			if r.Quantity == "switching_hz" && (r.Value < 399e3 || r.Value > 401e3) || r.Quantity == "bus_v" && (r.Value < 47.5 || r.Value > 48.5) {
				t.Errorf("trial %s reads %s = %g", trial.ID, r.Quantity, r.Value)
			}
		}
	}
}
