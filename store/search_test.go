package store

import (
	"cmp"
	"errors"
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"
	"unicode"

	"ringbook/snubber"
)

func found(t testing.TB, lb *Logbook, q Query) []snubber.Trial {
	t.Helper()
	var all []snubber.Trial
	for trial, err := range lb.Search(t.Context(), q) {
		if err != nil {
			t.Fatalf("%+v: %v", q, err)
		}
		all = append(all, trial)
	}
	return all
}

// told is trials of many words, parts and boards, in the order of time but for one in ten.
func told(n int, seed uint64) []snubber.Trial {
	random := rand.New(rand.NewPCG(seed, 1))
	pick := func(words ...string) string { return words[random.IntN(len(words))] }
	all := make([]snubber.Trial, n)
	for i := range all {
		t := &all[i]
		t.Board, t.Revision = pick("Kestrel", "Kestrel", "winch-drive", "Heron red"), pick("A", "B", "blue 2")
		t.At = time.Date(2026, 1, 1, 0, i, 0, 0, time.UTC)
		if random.IntN(10) == 0 {
			t.At = t.At.Add(-time.Duration(random.IntN(n)) * time.Minute)
		}
		t.Network = snubber.Network{Kind: snubber.Bare}
		if random.IntN(3) > 0 {
			t.Network = snubber.Network{Kind: snubber.RC, C: float64(1+random.IntN(20)) * 1e-10, R: float64(1+random.IntN(5)) * 3.3}
		}
		if random.IntN(2) == 0 {
			t.Part = pick("470p C0G", "2n2, drawer 3 blue", "Größe 0805")
		}
		for range random.IntN(6) {
			t.Note += pick("clip", "clip slipped", "blue", "red", "größer", "GROSSER", "kestrel", "scope", "2.2", "x") + pick(" ", "; ", "-")
		}
		if random.IntN(4) > 0 {
			t.Readings = append(t.Readings, snubber.Reading{Quantity: snubber.RingHz, Value: float64(10+random.IntN(20)) * 1e6, Instrument: pick("", "Larkspur Works,Scope 4,0007,1.2", "Finch,Red meter,1,1")})
		}
		if random.IntN(2) > 0 {
			t.Readings = append(t.Readings, snubber.Reading{Quantity: snubber.PeakV, Value: float64(50 + random.IntN(50))})
		}
		if random.IntN(8) == 0 {
			t.Struck = "wrong"
		}
	}
	return all
}

// tokens splits as the index does, for the words told uses: letters and digits, without case and accents.
func tokens(s string) []string {
	s = strings.NewReplacer("ö", "o").Replace(strings.ToLower(s))
	return strings.FieldsFunc(s, func(r rune) bool { return !unicode.IsLetter(r) && !unicode.IsDigit(r) })
}

func hasPhrase(text, phrase string) bool {
	prefix := strings.HasSuffix(phrase, "*")
	want, have := tokens(phrase), tokens(text)
	for i := 0; i+len(want) <= len(have); i++ {
		last := i + len(want) - 1
		if slices.Equal(have[i:last], want[:len(want)-1]) && (have[last] == want[len(want)-1] || prefix && strings.HasPrefix(have[last], want[len(want)-1])) {
			return true
		}
	}
	return false
}

// bruteForce is what Search should give.
func bruteForce(trials []snubber.Trial, words []string, q Query) []string {
	var found []snubber.Trial
	within := func(r Range, v float64, ok bool) bool {
		return r == (Range{}) || ok && (r.Min == 0 || v >= r.Min) && (r.Max == 0 || v <= r.Max)
	}
	value := func(t snubber.Trial) (float64, bool) {
		switch q.Sort {
		case ByC:
			return t.Network.C, t.Network.C != 0
		case ByR:
			return t.Network.R, t.Network.R != 0
		case ByTime:
			return float64(t.At.UnixNano()), true
		}
		r, ok := t.Reading(snubber.Quantity(q.Sort))
		return r.Value, ok
	}
	for _, t := range trials {
		texts := []string{t.Board, t.Revision, t.Part, t.Note}
		for _, r := range t.Readings {
			texts = append(texts, r.Instrument)
		}
		ring, hasRing := t.Reading(snubber.RingHz)
		peak, hasPeak := t.Reading(snubber.PeakV)
		ok := (q.Board == "" || t.Board == q.Board) && (q.Revision == "" || t.Revision == q.Revision) && (q.Network == "" || t.Network.Kind == q.Network) &&
			(q.Since.IsZero() || !t.At.Before(q.Since)) && (q.Until.IsZero() || t.At.Before(q.Until)) &&
			(t.Struck == "" || q.IncludeStruck || q.OnlyStruck) && (t.Struck != "" || !q.OnlyStruck) &&
			within(q.C, t.Network.C, t.Network.C != 0) && within(q.R, t.Network.R, t.Network.R != 0) &&
			within(q.RingHz, ring.Value, hasRing) && within(q.PeakV, peak.Value, hasPeak)
		for _, w := range words {
			ok = ok && slices.ContainsFunc(texts, func(text string) bool { return hasPhrase(text, w) })
		}
		if ok {
			found = append(found, t)
		}
	}
	slices.SortStableFunc(found, func(a, b snubber.Trial) int {
		x, hasX := value(a)
		y, hasY := value(b)
		if hasX != hasY {
			if hasX {
				return -1
			}
			return 1
		}
		order := cmp.Or(cmp.Compare(x, y), slices.IndexFunc(trials, func(t snubber.Trial) bool { return t.ID == a.ID })-
			slices.IndexFunc(trials, func(t snubber.Trial) bool { return t.ID == b.ID }))
		if q.Descending {
			return -order
		}
		return order
	})
	ids := make([]string, len(found))
	for i, t := range found {
		ids[i] = t.ID
	}
	return ids
}

// TestSearchAgainstBruteForce asks a few hundred questions of a logbook with several stretches and some trials after them:
// whole, counted, and page by page.
func TestSearchAgainstBruteForce(t *testing.T) {
	lb := openTemp(t)
	trials := told(stretchTrials*3+50, 1)
	for i := range trials {
		trials[i].ID = mustAdd(t, lb, trials[i])
		if trials[i].Part == "" && trials[i].Note == "" && i%2 == 0 && len(trials[i].Readings) > 0 {
			trials[i].Readings[0].Repeats = nil
		}
	}
	random := rand.New(rand.NewPCG(7, 7))
	pick := func(words ...string) string { return words[random.IntN(len(words))] }
	one := func() Range {
		switch random.IntN(4) {
		case 0:
			return Range{Min: 12e6, Max: 20e6}
		case 1:
			return Range{Max: 15e6}
		}
		return Range{}
	}
	total := 0
	for range 300 {
		var words []string
		for range random.IntN(3) {
			words = append(words, pick("clip", "blue", "kestrel", "KES*", "red", "grosser", "größer", `"clip slipped"`, `"slipped clip"*`, "2.2", "winch-drive", "drawer",
				"larkspur", "scope", "none", "s*", `"red meter"`, "0805", "x"))
		}
		q := Query{Words: strings.Join(words, pick(" ", "  ", "\n")), RingHz: one(), Descending: random.IntN(2) == 0,
			Sort: Sort(pick("", "", "", "c", "r", "ring_hz", "peak_v")), OnlyStruck: random.IntN(10) == 0}
		q.IncludeStruck = random.IntN(2) == 0
		q.Board, q.Revision = pick("", "", "Kestrel"), pick("", "", "", "A")
		q.Network = snubber.Kind(pick("", "", "rc", "bare"))
		if random.IntN(4) == 0 {
			q.C, q.R = Range{Min: 5e-10, Max: 1.2e-9}, Range{Min: 3.3}
		}
		if random.IntN(4) == 0 {
			q.PeakV = Range{Min: 60, Max: 90}
		}
		if random.IntN(4) == 0 {
			q.Since, q.Until = trials[100].At, trials[600].At
		}
		want := bruteForce(trials, words, q)
		total += len(want)
		ids := func(all []snubber.Trial) []string {
			ids := make([]string, len(all))
			for i := range all {
				ids[i] = all[i].ID
			}
			return ids
		}
		if got := ids(found(t, lb, q)); !slices.Equal(got, want) {
			t.Fatalf("%+v: %d found, want %d", q, len(got), len(want))
		}
		if n, err := lb.Count(t.Context(), q); err != nil || n != len(want) {
			t.Fatalf("%+v: %d counted, %v, want %d", q, n, err, len(want))
		}
		q.Limit = 1 + random.IntN(60)
		var paged []string
		for {
			page := ids(found(t, lb, q))
			paged = append(paged, page...)
			if len(page) < q.Limit {
				break
			}
			q.After = page[len(page)-1]
		}
		if !slices.Equal(paged, want) {
			t.Fatalf("%+v, page by page: %d found, want %d", q, len(paged), len(want))
		}
	}
	t.Logf("%d trials found in all", total)
	if total < 1000 {
		t.Error("hardly anything was found: nothing was tested")
	}
}

func TestSearchGivesWholeTrials(t *testing.T) {
	lb := openTemp(t)
	varied(t, lb)
	want := collect(t, lb, Scope{IncludeStruck: true})
	got := found(t, lb, Query{Words: "drawer", Scope: Scope{IncludeStruck: true, Limit: 100}})
	if fmt.Sprint(got) != fmt.Sprint(want) {
		t.Errorf("%v\nwant %v", got, want)
	}
	for range lb.Search(t.Context(), Query{}) {
		break // it may be left early
	}
	mustAdd(t, lb, example())
}

// TestHostileWords searches for whatever anybody might type: it finds something, nothing, or fails with a sentence.
func TestHostileWords(t *testing.T) {
	lb := openTemp(t)
	mustAdd(t, lb, example())
	for words, want := range map[string]string{
		"": "1", "  \t\n": "1", `""`: "1", "\x00": "1", "drawer\x00blue": "1", `"drawer 3`: "1", `"3, blue"`: "1", "größer": "1", "GROSSER": "0", "grosser": "0", "großer": "1",
		"drawer AND nothing": "0", "NOT drawer": "0", "NEAR(drawer blue)": "0", "part:drawer": "0", "drawer OR none": "0", "{part}": "0", "-drawer": "1", "+drawer": "1", "^drawer": "1",
		"dra*": "1", `"drawer 3 bl"*`: "1", `drawer"3"blue`: "1", "'; DROP TABLE trial; --": "0", `\`: "no letter or digit", "*": "no letter or digit", `"*"`: "no letter or digit", "!!!": "no letter or digit",
		"\xff\xfe": "1", "draw\xffer": "0", strings.Repeat("a", 1_000_000): "at most 10000", strings.Repeat("a ", 51): "more than 50 words", strings.Repeat(`"`, 9999): "1",
		strings.Repeat("x", 9000): "0", "\u202edrawer": "1", "😀": "no letter or digit", "ring_hz": "0",
	} {
		n, err := lb.Count(t.Context(), Query{Words: words})
		shown := quote(words)
		if err != nil {
			if strings.Contains(err.Error(), "fts5") || strings.Contains(err.Error(), "SQL") || strings.Contains(err.Error(), "syntax") || !strings.Contains(err.Error(), want) || len(err.Error()) > 400 {
				t.Errorf("%s: %v; want %s", shown, err, want)
			}
		} else if fmt.Sprint(n) != want {
			t.Errorf("%s: %d found, want %s", shown, n, want)
		}
	}
}

func TestQueriesThatMakeNoSense(t *testing.T) {
	lb := openTemp(t)
	mustAdd(t, lb, example())
	for want, q := range map[string]Query{
		"not one of at, c": {Sort: "note; DROP TABLE trial"}, "lower bound first": {C: Range{2, 1}}, "must be 0": {Scope: Scope{Limit: -1}},
		"network":       {Network: "xyz"},
		"no such trial": {After: "nobody"},
	} {
		for _, err := range lb.Search(t.Context(), q) {
			if err == nil || !strings.Contains(err.Error(), want) {
				t.Errorf("%+v: %v; want %s", q, err, want)
			}
		}
		if q.After == "" {
			if _, err := lb.Count(t.Context(), q); err == nil || !strings.Contains(err.Error(), want) {
				t.Errorf("count %+v: %v; want %s", q, err, want)
			}
		}
	}
	for _, err := range lb.Search(t.Context(), Query{After: "nobody"}) {
		if !errors.Is(err, ErrNoTrial) {
			t.Error(err)
		}
	}
}

func FuzzSearchWords(f *testing.F) {
	lb := openTemp(f)
	mustAdd(f, lb, example())
	for _, s := range []string{"drawer blue", `"drawer 3`, "dra*", "a AND (b", "NEAR(a b, 3)", "\x00*", `"""`, "ring_hz:", "😀\u0300x"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, words string) {
		if _, err := lb.Count(t.Context(), Query{Words: words}); err != nil && (strings.Contains(err.Error(), "fts5") || strings.Contains(err.Error(), "logic error")) {
			t.Fatal(err)
		}
	})
}
