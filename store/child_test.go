package store

import (
	"bufio"
	"context"
	"fmt"
	"os"
	"os/exec"
	"strconv"
	"strings"
	"testing"

	"ringbook/snubber/waveform"
)

// The test binary runs itself again as another program that logs trials until it is killed: these name its file and what
// it does there.
const (
	childFile = "RINGBOOK_TEST_CHILD_FILE"
	childWork = "RINGBOOK_TEST_CHILD_WORK"

	childReady = "ready" // its first line, once it has opened the logbook
)

func TestMain(m *testing.M) {
	if path := os.Getenv(childFile); path != "" {
		if err := child(path, os.Getenv(childWork)); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
		os.Exit(0)
	}
	os.Exit(m.Run())
}

// child prints each id once Add or AddWithWaveforms has acknowledged it, or "imported" and a count once AddAll has.
func child(path, work string) error {
	ctx := context.Background()
	switch work {
	case "read", "stream":
		return childReads(ctx, path, Query{})
	case "search":
		return childReads(ctx, path, Query{Words: "drawer"})
	}
	lb, err := Open(ctx, path)
	if err != nil {
		return err
	}
	defer lb.Close()
	if work == "look" {
		return nil
	}
	fmt.Println(childReady)
	if work == "import" {
		for {
			n, err := lb.AddAll(ctx, many(importSize), nil)
			if err != nil {
				return err
			}
			fmt.Println("imported", n)
		}
	}
	if other, ok := strings.CutPrefix(work, "merge "); ok {
		m, err := lb.Merge(ctx, other, nil)
		if err == nil {
			fmt.Println("merged", m.Added())
		}
		return err
	}
	number, with := strings.CutSuffix(work, " with waveforms")
	n, err := strconv.Atoi(number)
	if err != nil {
		return err
	}
	trial, records := example(), []waveform.Record(nil)
	if with {
		trial, records = withWaveforms()
	}
	for range n {
		id, err := lb.AddWithWaveforms(ctx, trial, records)
		if err != nil {
			return err
		}
		fmt.Println(id)
	}
	return nil
}

const importSize = 20

func childReads(ctx context.Context, path string, q Query) error {
	lb, err := OpenReadOnly(ctx, path)
	if err != nil {
		return err
	}
	defer lb.Close()
	n := 0
	for _, err := range lb.Search(ctx, q) {
		if err != nil {
			return err
		}
		n++
	}
	fmt.Println(n, "trials with", peakMemory(), "MB at most")
	return nil
}

func startChild(t testing.TB, path, work string) (*exec.Cmd, *bufio.Scanner) {
	t.Helper()
	cmd := exec.CommandContext(t.Context(), os.Args[0])
	cmd.Env = append(os.Environ(), childFile+"="+path, childWork+"="+work)
	cmd.Stderr = os.Stderr
	out, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	return cmd, bufio.NewScanner(out)
}
