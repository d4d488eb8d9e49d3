package main

import (
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"
	"time"

	"ringbook/recipes"
	"ringbook/snubber"
	"ringbook/store"
)

// hostileText is what a page must show as it stands: markup, a formula as a spreadsheet reads one, quotes, marks of Markdown, text
// from right to left, and letters that turn what follows them around.
func hostileText(field string) string {
	return field + ` <script>pwned=1</script><img src=x onerror=pwned=1>"q" 'a' & &lt; =1+1 ` + "`c` **b** [l](javascript:pwned=1) שלום \u202eabc"
}

// without is a word that can be broken nowhere.
var without = strings.Repeat("x", 10_000)

// hostileLogbook makes a logbook with the demonstration's readings, and such text wherever text may stand.
func hostileLogbook(t *testing.T) *store.Logbook {
	t.Helper()
	ctx := t.Context()
	from := demoLogbook(t)
	lb, err := store.Open(ctx, filepath.Join(t.TempDir(), "hostile.db"))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { lb.Close() })
	board := hostileText("board")
	revision := func(name string) string { return hostileText("revision " + name) }
	if err := lb.AddBoard(ctx, store.Board{Name: board, DeviceV: 100, Note: hostileText("about the board")}); err != nil {
		t.Fatal(err)
	}
	ids := map[string]string{}
	n := 0
	for trial, err := range from.Trials(ctx, store.Scope{IncludeStruck: true}) {
		if err != nil {
			t.Fatal(err)
		}
		was := trial
		trial.ID, trial.Board, trial.Revision, trial.Struck = "", board, revision(was.Revision), ""
		trial.Session, trial.Part, trial.Note = hostileText("session"), hostileText("part"), hostileText("note")
		switch n {
		case 0:
			trial.Part = without
		case 1:
			trial.Note = hostileText("long note") + "\n" + without + "\n\tand on"
		}
		for i := range trial.Readings {
			trial.Readings[i].Instrument = hostileText("instrument")
		}
		id, err := lb.Add(ctx, trial)
		if err != nil {
			t.Fatal(err)
		}
		ids[was.ID] = id
		n++
	}
	struck, err := lb.Add(ctx, snubber.Trial{Board: board, Revision: revision("B"), At: time.Date(2026, 3, 1, 0, 0, 0, 0, time.UTC),
		Network: snubber.Network{Kind: snubber.Bare}, Readings: []snubber.Reading{{Quantity: snubber.RingHz, Value: 1e6}}})
	if err != nil {
		t.Fatal(err)
	}
	if err := lb.Strike(ctx, struck, hostileText("reason")+" "+without); err != nil {
		t.Fatal(err)
	}
	for d, err := range from.Decisions(ctx, store.Scope{}) {
		if err != nil {
			t.Fatal(err)
		}
		d.ID, d.Board, d.Revision = "", board, revision(d.Revision)
		for i, id := range d.Trials {
			d.Trials[i] = ids[id]
		}
		var trials []snubber.Trial
		for trial, err := range lb.Trials(ctx, store.Scope{}) {
			if err != nil {
				t.Fatal(err)
			}
			if slices.Contains(d.Trials, trial.ID) {
				trials = append(trials, trial)
			}
		}
		d.Digest = store.TrialsDigest(trials)
		if _, err := lb.AddDecision(ctx, d); err != nil {
			t.Fatal(err)
		}
	}
	return lb
}

// hostileFiles are all recipes' pages of it.
func hostileFiles(t *testing.T) []pageFile {
	t.Helper()
	lb := hostileLogbook(t)
	dir := t.TempDir()
	var files []pageFile
	for _, r := range recipes.All() {
		scope := store.Scope{Board: hostileText("board")}
		if r.Single {
			scope.Revision = hostileText("revision " + demoRevision)
		}
		woven, err := r.Page(t.Context(), recipes.Source{Logbook: lb, Scope: scope, Limits: recipes.Request{Limits: snubber.Limits{CTol: demoCTol, RTol: demoRTol}}})
		if err != nil {
			t.Fatalf("%s: %v", r.Name, err)
		}
		files = append(files, writePage(t, dir, "hostile "+r.Name, woven))
	}
	return files
}

// captureFiles are pages of `ringbook waveform -o`: one of a capture in the demonstration's logbook, one of a file with a name
// that no file should have.
func captureFiles(t *testing.T) []pageFile {
	t.Helper()
	dir := t.TempDir()
	lb := demoLogbook(t)
	logged := ""
	for trial, err := range lb.Trials(t.Context(), store.Scope{Board: demoBoard, Revision: demoRevision}) {
		if err != nil {
			t.Fatal(err)
		}
		for _, err := range lb.Waveforms(t.Context(), trial.ID) {
			if err != nil {
				t.Fatal(err)
			}
			logged = trial.ID
		}
	}
	odd := filepath.Join(dir, strings.ReplaceAll(hostileText("file"), "/", "")+"\x1b[31m\a.csv")
	if runtime.GOOS == "windows" { // has no such names
		odd = filepath.Join(dir, "file.csv")
	}
	for name, hz := range map[string]float64{odd: 42e6, filepath.Join(dir, "edge.csv"): 44e6} {
		var b strings.Builder
		for i := range 2000 {
			at := float64(i) * 0.5e-9
			v := 0.0
			if after := at - 100e-9; after >= 0 {
				v = 48 - 40*math.Exp(-after/150e-9)*math.Cos(2*math.Pi*hz*after)
			}
			fmt.Fprintf(&b, "%g,%g\n", at, v+0.05*math.Sin(float64(i*i)))
		}
		if err := os.WriteFile(name, []byte(b.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	var files []pageFile
	for name, args := range map[string][]string{
		"waveform of a trial": {"--trial", logged, "--logbook", lb.Path()},
		"hostile waveform":    {filepath.Join(dir, "edge.csv"), "--against", odd},
	} {
		path := filepath.Join(dir, name+".html")
		if err := run(t.Context(), append([]string{"waveform", "-o", path}, args...), strings.NewReader(""), io.Discard, io.Discard); err != nil {
			t.Fatal(err)
		}
		files = append(files, pageFile{name, path})
	}
	return files
}

// longFiles is the history of many trials, which needs more than a sheet.
func longFiles(t *testing.T) []pageFile {
	t.Helper()
	path := filepath.Join(t.TempDir(), "long.db")
	logbookOf(t, path, 120)
	lb, err := store.OpenReadOnly(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { lb.Close() })
	history, err := recipeNamed("history")
	if err != nil {
		t.Fatal(err)
	}
	woven, err := history.Page(t.Context(), recipes.Source{Logbook: lb})
	if err != nil {
		t.Fatal(err)
	}
	return []pageFile{writePage(t, t.TempDir(), "long history", woven)}
}

// showsHostile looks for such text on a page, letter by letter, where the page has a place for it.
func (x *tab) showsHostile(name string) {
	x.Helper()
	text := squeezed(eval[string](x, "document.body.innerText"))
	var want []string
	switch name {
	case "hostile waveform":
		if runtime.GOOS != "windows" {
			want = append(want, strings.ReplaceAll(hostileText("file"), "/", "")+`\x1b[31m\x07.csv`)
		}
	case "hostile history":
		want = append(want, hostileText("revision B"), hostileText("note"), hostileText("long note")+" "+without+" and on", hostileText("reason")+" "+without)
		fallthrough
	case "hostile revisions":
		want = append(want, hostileText("board"), hostileText("revision A"))
	default:
		want = append(want, hostileText("board")+" "+hostileText("revision B"))
	}
	for _, w := range want {
		// What would turn the letters after it around is shown as a number.
		if w = squeezed(strings.ReplaceAll(w, "\u202e", `\u202e`)); !strings.Contains(text, w) {
			x.Errorf("the page does not show %.300q as it stands", w)
		}
	}
}

// squeezed is a text with single spaces for all white space.
func squeezed(s string) string { return strings.Join(strings.Fields(s), " ") }
