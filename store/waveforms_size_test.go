package store

import (
	"context"
	"os"
	"path/filepath"
	"testing"
	"time"

	"github.com/google/uuid"

	"ringbook/snubber/waveform"
)

// What an 8-bit record of 10,000 samples costs on the disk.
func TestWaveformsAreSmall(t *testing.T) {
	size := func(records ...waveform.Record) int64 {
		path := filepath.Join(t.TempDir(), "ringbook.db")
		lb, err := Open(t.Context(), path)
		if err != nil {
			t.Fatal(err)
		}
		for range 20 {
			if _, err := lb.AddWithWaveforms(t.Context(), example(), records); err != nil {
				t.Fatal(err)
			}
		}
		if err := lb.Close(); err != nil {
			t.Fatal(err)
		}
		info, err := os.Stat(path)
		if err != nil {
			t.Fatal(err)
		}
		return info.Size()
	}
	each := (size(captured(10_000)) - size()) / 20
	t.Logf("%d bytes on the disk for each record of 10,000 samples", each)
	if each > 10_000 {
		t.Errorf("%d bytes: more than the converter's own", each)
	}
}

// BenchmarkAddWithWaveforms is one durable trial with a record of 10,000 samples, packed and with its digest, against the bare
// inserts of the same rows with the samples already packed, turn by turn.
func BenchmarkAddWithWaveforms(b *testing.B) {
	lb, x, t := openTemp(b), openBare(b), benchTrial()
	records := []waveform.Record{captured(10_000)}
	p, err := packRecord(records[0])
	if err != nil {
		b.Fatal(err)
	}
	insert, err := x.conn.PrepareContext(b.Context(), insertWaveform)
	if err != nil {
		b.Fatal(err)
	}
	at := timeText(t.At)
	var ours, bares time.Duration
	for b.Loop() {
		start := time.Now()
		if _, err := lb.AddWithWaveforms(b.Context(), t, records); err != nil {
			b.Fatal(err)
		}
		middle := time.Now()
		x.exec(b, "BEGIN IMMEDIATE")
		seq := x.add(b, &t, at)
		_, err := insert.ExecContext(context.Background(), uuid.Must(uuid.NewV7()).String(), seq, p.Start, p.Interval, p.StepV, p.samples, p.encoding, p.digest[:], p.Origin)
		if err != nil {
			b.Fatal(err)
		}
		x.exec(b, "COMMIT")
		ours += middle.Sub(start)
		bares += time.Since(middle)
	}
	b.ReportMetric(float64(ours.Microseconds())/float64(b.N), "µs/AddWithWaveforms")
	b.ReportMetric(float64(bares.Microseconds())/float64(b.N), "µs/bare")
	b.ReportMetric(float64(ours)/float64(bares), "times-bare")
	b.ReportMetric(float64(len(p.samples)), "bytes/record")
}

// BenchmarkWaveforms reads the waveform of one trial, 10,000 samples.
func BenchmarkWaveforms(b *testing.B) {
	lb := openTemp(b)
	id, err := lb.AddWithWaveforms(b.Context(), benchTrial(), []waveform.Record{captured(10_000)})
	if err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	for b.Loop() {
		for _, err := range lb.Waveforms(b.Context(), id) {
			if err != nil {
				b.Fatal(err)
			}
		}
	}
}
