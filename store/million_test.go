package store

import (
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"
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
