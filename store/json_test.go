package store

import (
	"bytes"
	"errors"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

func export(t testing.TB, lb *Logbook) string {
	t.Helper()
	var out bytes.Buffer
	if _, err := lb.ExportJSON(t.Context(), &out, nil); err != nil {
		t.Fatal(err)
	}
	return out.String()
}

func TestExportRoundTrip(t *testing.T) {
	lb := bench(t, 300)
	first := export(t, lb)
	again := openTemp(t)
	m, err := again.ImportJSON(t.Context(), strings.NewReader(first), nil)
	if err != nil || m.Trials != 306 || m.Strikes != 2 || m.Decisions != 1 || m.Corrections != 3 || m.Known != 0 {
		t.Fatalf("%+v, %v", m, err)
	}
	if second := export(t, again); second != first {
		t.Error("exported again, it is another:", cmp.Diff(first, second))
	}
	if diff := cmp.Diff(contents(t, lb), contents(t, again)); diff != "" {
		t.Error(diff)
	}
	mustAudit(t, again)
	if m, err := again.ImportJSON(t.Context(), strings.NewReader(first), nil); err != nil || m.Added() != 0 || m.Known != 312 {
		t.Errorf("a second time: %+v, %v", m, err)
	}
	if m, err := lb.ImportJSON(t.Context(), strings.NewReader(first), nil); err != nil || m.Added() != 0 {
		t.Errorf("where it comes from: %+v, %v", m, err)
	}
	if m := mustMerge(t, lb, again); m.Added() != 0 {
		t.Errorf("merged as well: %+v", m)
	}
}

// TestExportOfAnyTrial puts what rapid draws through an export.
func TestExportOfAnyTrial(t *testing.T) {
	from, to := openTemp(t), openTemp(t)
	rapid.Check(t, func(rt *rapid.T) {
		trial := drawTrial(rt)
		repeats := rapid.SliceOfN(rapid.Float64Range(-1e300, 1e300), 1, 5)
		for i := range trial.Readings {
			if rapid.Bool().Draw(rt, "repeated") {
				trial.Readings[i].Repeats = repeats.Draw(rt, "repeats")
				trial.Readings[i].Instrument = "Larkspur Works,Scope 4,<&>\u2028,1.2"
			}
		}
		id, err := from.Add(t.Context(), trial)
		if err != nil {
			rt.Fatal(err)
		}
		want, err := from.Trial(t.Context(), id)
		if err != nil {
			rt.Fatal(err)
		}
		if _, err := to.ImportJSON(t.Context(), strings.NewReader(export(t, from)), nil); err != nil {
			rt.Fatal(err)
		}
		got, err := to.Trial(t.Context(), id)
		if diff := cmp.Diff(want, got); err != nil || diff != "" {
			rt.Fatal(err, diff)
		}
	})
	mustAudit(t, to)
}

func TestImportRefuses(t *testing.T) {
	lb := openTemp(t)
	varied(t, lb)
	sound := export(t, lb)
	lines := strings.SplitAfter(sound, "\n")
	for name, c := range map[string]struct{ text, want string }{
		"nothing":         {"", "is empty"},
		"another file":    {"board,revision\n", "line 1"},
		"a newer one":     {strings.Replace(sound, "entries 1", "entries 2", 1), "newer"},
		"no JSON":         {lines[0] + lines[1] + "{\n", "line 3"},
		"two on a line":   {lines[0] + strings.TrimSpace(lines[1]) + lines[2], "line 2"},
		"an unknown name": {strings.Replace(sound, `"board"`, `"boards"`, 1), "boards"},
		"no kind":         {lines[0] + "{}\n", "it has 0"},
		"another note":    {strings.Replace(sound, "mill spindle drive", "mill spindle drives", 1), "is not what was logged"},
		"a missing trial": {lines[0] + strings.Join(lines[10:], ""), "which is not there"},
		"another link":    {strings.Replace(sound, `"link":"`, `"link":"zz`, 1), "is not a SHA-256"},
		"a bad time":      {strings.Replace(sound, `"at":"2`, `"at":"x`, 1), "is not a time"},
	} {
		to := openTemp(t)
		m, err := to.ImportJSON(t.Context(), strings.NewReader(c.text), nil)
		if err == nil || !strings.Contains(err.Error(), c.want) || m != (Merged{}) {
			t.Errorf("%s: %+v, %v; want %s", name, m, err, c.want)
		}
		if r := mustAudit(t, to); r.Entries != 0 {
			t.Errorf("%s: %d entries were imported", name, r.Entries)
		}
	}
	tamper(t, lb, `DROP TRIGGER trial_stays; UPDATE trial SET note = 'x' WHERE seq = 3`)
	if _, err := lb.ExportJSON(t.Context(), &bytes.Buffer{}, nil); !errors.Is(err, ErrDamaged) {
		t.Error(err)
	}
}

func FuzzImportJSON(f *testing.F) {
	lb := openTemp(f)
	varied(f, lb)
	for _, line := range strings.Split(export(f, lb), "\n")[1:] {
		f.Add(line)
	}
	to := openTemp(f)
	f.Fuzz(func(t *testing.T, line string) {
		m, err := to.ImportJSON(t.Context(), strings.NewReader(exportFormat+"\n"+line), nil)
		if err != nil && (err.Error() == "" || m != (Merged{})) {
			t.Fatal(m, err)
		}
	})
}
