package main

import (
	"bytes"
	"errors"
	"io"
	"regexp"
	"slices"
	"strings"
	"testing"
	"time"

	"ringbook/snubber"
	"ringbook/store"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

func eachOf(trials []snubber.Trial, err error) func(func(snubber.Trial, error) bool) {
	return func(yield func(snubber.Trial, error) bool) {
		for _, t := range trials {
			if !yield(t, nil) {
				return
			}
		}
		if err != nil {
			yield(snubber.Trial{}, err)
		}
	}
}

// begins is what a spreadsheet takes for a formula: OWASP, "CSV Injection", from memory, with the full-width equals sign.
var begins = regexp.MustCompile(`^\s*[=+@＝-]`)

// What an export writes, an import reads back, whatever the words are; and no cell of words begins like a formula.
func TestGuardedComesBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		words := rapid.StringOfN(rapid.SampledFrom([]rune("=+-@'\" \t\n,;＝é0a{")), 0, 12, -1)
		name := rapid.Map(words, func(s string) string {
			return strings.TrimSpace(strings.Map(func(r rune) rune {
				if r < ' ' {
					return -1
				}
				return r
			}, s)) + "B"
		})
		trials := rapid.SliceOfN(rapid.Custom(func(t *rapid.T) snubber.Trial {
			return snubber.Trial{
				Board: name.Draw(t, "board"), Revision: name.Draw(t, "revision"), Session: name.Draw(t, "session"),
				Part: words.Draw(t, "part"), Note: words.Draw(t, "note"), At: time.Date(2026, 3, 1, 9, 0, 0, 0, time.UTC),
				Network: snubber.Network{Kind: snubber.Bare}, Point: snubber.OperatingPoint{BusV: -48},
			}
		}), 1, 5).Draw(t, "trials")
		var text bytes.Buffer
		if n, err := writeGuarded(&text, eachOf(trials, nil)); err != nil || n != len(trials) {
			t.Fatalf("%d, %v", n, err)
		}
		for _, cell := range cellsOf(t, text.String()) {
			if begins.MatchString(cell) && cell != "-48" {
				t.Fatalf("%q begins like a formula in %s", cell, &text)
			}
		}
		in, lines, err := unpacked(&text)
		if err != nil || lines {
			t.Fatalf("JSON Lines: %v, %v", lines, err)
		}
		var back []snubber.Trial
		for x, err := range store.ReadCSV(in) {
			if err != nil {
				t.Fatal(err)
			}
			back = append(back, x)
		}
		if diff := cmp.Diff(trials, back); diff != "" {
			t.Fatal("(-want +got):\n" + diff)
		}
	})
}

func cellsOf(t *rapid.T, text string) []string {
	all, err := io.ReadAll(recast(strings.NewReader(text), func(_, row []string) ([]string, error) { return row, nil }))
	if err != nil {
		t.Fatal(err)
	}
	var cells []string
	r := recast(bytes.NewReader(all), func(_, row []string) ([]string, error) {
		cells = append(cells, slices.Clone(row)...)
		return row, nil
	})
	if _, err := io.Copy(io.Discard, r); err != nil {
		t.Fatal(err)
	}
	return cells
}

type fullDisk struct{}

func (fullDisk) Write([]byte) (int, error) { return 0, errors.New("the disk is full") }

// What fails on either side ends the other.
func TestGuardedFails(t *testing.T) {
	long := snubber.Trial{Board: "a", Revision: "b", Network: snubber.Network{Kind: snubber.Bare}, Note: strings.Repeat("x", 1<<16)}
	if _, err := writeGuarded(fullDisk{}, eachOf([]snubber.Trial{long, long, long}, nil)); err == nil || !strings.Contains(err.Error(), "the disk is full") {
		t.Errorf("a full disk: %v", err)
	}
	gone := errors.New("the logbook is gone")
	if _, err := writeGuarded(io.Discard, eachOf([]snubber.Trial{long}, gone)); !errors.Is(err, gone) {
		t.Errorf("trials that end: %v", err)
	}
}

// Any file ends in an error or in trials, and takes no more memory than its rows.
func FuzzUnpack(f *testing.F) {
	for _, s := range []string{
		"board,revision,network,note,guarded\nA,1,bare,'=1,note\n", "guarded\n\n\"a\nb\"\n", "\ufeffguarded,board\n\"", "{\"ringbook\":\"entries 1\"}\n", "\x1f\x8b\x08", "",
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, file []byte) {
		in, _, err := unpacked(bytes.NewReader(file))
		if err != nil {
			return
		}
		for range store.ReadCSV(in) {
		}
	})
}
