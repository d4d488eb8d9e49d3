package store

import (
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"ringbook/snubber"
)

// BenchmarkImportMillion is trial import's inner job at 10^6 rows: CSV read and logged in one transaction. It is skipped
// unless RINGBOOK_MILLION is set.
func BenchmarkImportMillion(b *testing.B) {
	rows, _ := strconv.Atoi(os.Getenv("RINGBOOK_MILLION"))
	if rows == 0 {
		b.Skip("set RINGBOOK_MILLION to a number of rows, such as 1000000")
	}
	path := filepath.Join(b.TempDir(), "trials.csv")
	out, err := os.Create(path)
	if err != nil {
		b.Fatal(err)
	}
	if _, err := WriteCSV(out, many(rows)); err != nil {
		b.Fatal(err)
	}
	if err := out.Close(); err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		lb := openTemp(b)
		in, err := os.Open(path)
		if err != nil {
			b.Fatal(err)
		}
		if n, err := lb.AddAll(b.Context(), ReadCSV(in), nil); n != rows || err != nil {
			b.Fatal(n, err)
		}
		in.Close()
		b.StopTimer()
		start, n := time.Now(), 0
		for _, err := range lb.Trials(b.Context(), Scope{}) {
			if err != nil {
				b.Fatal(err)
			}
			n++
		}
		b.ReportMetric(float64(n)/time.Since(start).Seconds(), "read/s")
		start = time.Now()
		again, err := Open(b.Context(), lb.Path())
		if err != nil {
			b.Fatal(err)
		}
		b.ReportMetric(time.Since(start).Seconds()*1000, "ms-to-open")
		again.Close()
		start = time.Now()
		if last := collect(b, lb, Scope{Limit: 1}); len(last) != 1 {
			b.Fatal(last)
		} else if _, err := lb.Trial(b.Context(), ShortID(last[0].ID)); err != nil {
			b.Fatal(err)
		}
		b.ReportMetric(time.Since(start).Seconds()*1000, "ms-to-latest-and-by-id")
		b.StartTimer()
	}
	b.ReportMetric(float64(rows*b.N)/b.Elapsed().Seconds(), "trials/s")
	b.ReportMetric(peakMemory(), "peak-MB")
}

// history is n trials as years at many benches leave them: thirty boards with three revisions, parts from a drawer, notes of a
// few words, three instruments; read minutes apart.
func history(n int) func(func(snubber.Trial, error) bool) {
	return func(yield func(snubber.Trial, error) bool) {
		random := rand.New(rand.NewPCG(9, 9))
		words := strings.Fields("clip blue red slipped hot cold spring ground short long again first twice bench lamp quiet loud ringing clean copper")
		for i := range n {
			t := benchTrial()
			t.Board, t.Revision = "board-"+strconv.Itoa(random.IntN(30)), string(rune('A'+random.IntN(3)))
			t.At = time.Date(2016, 1, 1, 0, 5*i, random.IntN(600), 0, time.UTC)
			t.Network.C, t.Network.R = float64(1+random.IntN(47))*1e-10, float64(1+random.IntN(30))
			t.Part = "drawer " + strconv.Itoa(random.IntN(40))
			t.Note = ""
			for range random.IntN(6) {
				t.Note += words[random.IntN(len(words))] + " "
			}
			if i%(n/20) == 7 {
				t.Note += "kingfisher"
			}
			t.Readings[0].Value = 1e6 * (10 + 20*random.Float64())
			t.Readings[0].Instrument = "Larkspur Works,Scope " + strconv.Itoa(random.IntN(3)) + ",0007,1.2"
			if !yield(t, nil) {
				return
			}
		}
	}
}

// BenchmarkHistory looks into a history of 10,000 trials and into one of RINGBOOK_MILLION: the first page of fifty by words
// and ranges, opening, counting, an audit, and all of it streamed by another process.
func BenchmarkHistory(b *testing.B) {
	rows, _ := strconv.Atoi(os.Getenv("RINGBOOK_MILLION"))
	if rows == 0 {
		b.Skip("set RINGBOOK_MILLION to a number of rows, such as 1000000")
	}
	queries := map[string]Query{
		"word":    {Words: "blue", RingHz: Range{12e6, 14e6}},                                 // a sixth of the trials, a tenth of these
		"words":   {Words: "blue clip drawer", C: Range{1e-9, 2e-9}},                          // in notes and parts
		"narrow":  {Words: "blue", RingHz: Range{12e6, 12.05e6}},                              // one in 2400
		"name":    {Words: "board 7", RingHz: Range{12e6, 14e6}},                              // a board's name
		"device":  {Words: "larkspur scop* spring", RingHz: Range{12e6, 14e6}},                // an instrument's, with a word
		"rare":    {Words: "kingfisher", RingHz: Range{10e6, 30e6}},                           // twenty in all
		"none":    {Words: "albatross"},                                                       // not there
		"oldest":  {Words: "blue", RingHz: Range{12e6, 14e6}, Descending: true},               // turned below
		"nowords": {RingHz: Range{12e6, 14e6}, Scope: Scope{Board: "board-7", Revision: "A"}}, // by ranges alone
	}
	for name, q := range queries {
		q.Limit, q.Descending = 50, name != "oldest"
		queries[name] = q
	}
	say := func(format string, values ...any) { fmt.Fprintf(os.Stderr, format+"\n", values...) } // b.Log cuts it short
	took := map[string][2]float64{}
	for b.Loop() {
		for i, n := range []int{10_000, rows} {
			lb := openTemp(b)
			start := time.Now()
			if got, err := lb.AddAll(b.Context(), history(n), nil); got != n || err != nil {
				b.Fatal(got, err)
			}
			say("%d trials: %.0f trials/s imported", n, float64(n)/time.Since(start).Seconds())
			for range 100 { // some since the last stretch
				for t := range history(25) {
					t.At = time.Time{}
					mustAdd(b, lb, t)
					break
				}
			}
			for name, q := range queries {
				best := time.Hour
				for range 5 {
					start := time.Now()
					got := len(found(b, lb, q))
					if best = min(best, time.Since(start)); got != 50 && name != "rare" && name != "none" && n > 100_000 {
						b.Fatalf("%s: %d found", name, got)
					}
				}
				x := took[name]
				x[i] = best.Seconds() * 1000
				took[name] = x
			}
			start = time.Now()
			again, err := OpenReadOnly(b.Context(), lb.Path())
			if err != nil {
				b.Fatal(err)
			}
			say("%d trials: %.1f ms to open", n, time.Since(start).Seconds()*1000)
			again.Close()
			start = time.Now()
			count, err := lb.Count(b.Context(), queries["word"])
			say("%d trials: %d counted in %.0f ms, %v", n, count, time.Since(start).Seconds()*1000, err)
			start = time.Now()
			report, err := lb.Audit(b.Context(), nil)
			if err != nil || !report.Sound() {
				b.Fatal(report, err)
			}
			say("%d trials: audited at %.0f trials/s", n, float64(n)/time.Since(start).Seconds())
			info, _ := os.Stat(lb.Path())
			say("%d trials: %d bytes each", n, info.Size()/int64(n))
			for _, work := range []string{"stream", "search"} {
				start = time.Now()
				_, lines := startChild(b, lb.Path(), work)
				for lines.Scan() {
					say("%d trials: %s: %s in %.1f s", n, work, lines.Text(), time.Since(start).Seconds())
				}
			}
		}
	}
	for name, x := range took {
		say("%-8s %6.2f ms of 10000, %6.2f ms of %d: %.2f times", name, x[0], x[1], rows, x[1]/x[0])
	}
}

// peakMemory is the most memory this process has had, in MB, where Linux tells it.
func peakMemory() float64 {
	status, _ := os.ReadFile("/proc/self/status")
	for line := range strings.Lines(string(status)) {
		if kb, ok := strings.CutPrefix(line, "VmHWM:"); ok {
			n, _ := strconv.ParseFloat(strings.TrimSpace(strings.TrimSuffix(strings.TrimSpace(kb), "kB")), 64)
			return n / 1000
		}
	}
	return 0
}
