package store

import (
	"context"
	"database/sql"
	"testing"
	"time"

	"github.com/google/uuid"

	"ringbook/snubber"
)

// bare is the driver alone on a file of its own, with the same tables, indexes and settings and no triggers: what cannot be
// done faster without doing less.
type bare struct {
	conn           *sql.Conn
	trial, reading *sql.Stmt
}

func openBare(b *testing.B) *bare {
	b.Helper()
	lb := openTemp(b)
	if err := lb.EnsureRevision(b.Context(), "Kestrel", "B"); err != nil {
		b.Fatal(err)
	}
	if err := lb.Close(); err != nil {
		b.Fatal(err)
	}
	db, err := sql.Open("sqlite", dsn(lb.Path(), "mode=rw", busyWait))
	if err != nil {
		b.Fatal(err)
	}
	b.Cleanup(func() { db.Close() })
	x := &bare{}
	if x.conn, err = db.Conn(b.Context()); err != nil {
		b.Fatal(err)
	}
	b.Cleanup(func() { x.conn.Close() })
	var drops string
	err = x.conn.QueryRowContext(b.Context(), `SELECT group_concat('DROP TRIGGER ' || name, ';') FROM sqlite_schema WHERE type = 'trigger'`).Scan(&drops)
	if err != nil {
		b.Fatal(err)
	}
	x.exec(b, drops+"; PRAGMA cache_size = -16384; PRAGMA temp_store = MEMORY") // as the writer has them
	if x.trial, err = x.conn.PrepareContext(b.Context(), insertTrial); err != nil {
		b.Fatal(err)
	}
	if x.reading, err = x.conn.PrepareContext(b.Context(), insertReading); err != nil {
		b.Fatal(err)
	}
	return x
}

func (x *bare) exec(b *testing.B, script string) {
	if _, err := x.conn.ExecContext(context.Background(), script); err != nil {
		b.Fatal(err)
	}
}

func (x *bare) add(b *testing.B, t *snubber.Trial, at string) int64 {
	ctx := context.Background()
	n := &t.Network
	result, err := x.trial.ExecContext(ctx, uuid.Must(uuid.NewV7()).String(), 1, nil, nil, at, at, string(n.Kind),
		n.C, n.CTol, n.R, n.RTol, nil, nil, nil, t.ProbeC, t.Part, t.Note)
	if err != nil {
		b.Fatal(err)
	}
	seq, err := result.LastInsertId()
	if err != nil {
		b.Fatal(err)
	}
	for _, r := range t.Readings {
		if _, err := x.reading.ExecContext(ctx, seq, string(r.Quantity), r.Value, r.U+1, nil, nil); err != nil {
			b.Fatal(err)
		}
	}
	return seq
}

// benchTrial has five readings, and nothing that bare does not write.
func benchTrial() snubber.Trial {
	t := example()
	t.Session, t.Point, t.Network.ESR, t.Network.MeasuredC, t.Network.MeasuredU = "", snubber.OperatingPoint{}, 0, 0, 0
	for i := range t.Readings {
		t.Readings[i].Repeats, t.Readings[i].Instrument = nil, ""
		t.Readings[i].U++
	}
	return t
}

// BenchmarkAdd is one durable trial with five readings, against the bare inserts in one transaction, turn by turn.
func BenchmarkAdd(b *testing.B) {
	lb, x, t := openTemp(b), openBare(b), benchTrial()
	at := timeText(t.At)
	var ours, bares time.Duration
	for b.Loop() {
		start := time.Now()
		if _, err := lb.Add(b.Context(), t); err != nil {
			b.Fatal(err)
		}
		middle := time.Now()
		x.exec(b, "BEGIN IMMEDIATE")
		x.add(b, &t, at)
		x.exec(b, "COMMIT")
		ours += middle.Sub(start)
		bares += time.Since(middle)
	}
	b.ReportMetric(float64(ours.Microseconds())/float64(b.N), "µs/Add")
	b.ReportMetric(float64(bares.Microseconds())/float64(b.N), "µs/bare")
	b.ReportMetric(float64(ours)/float64(bares), "times-bare")
}

// BenchmarkAddAll is an import of 100,000 trials with five readings, against the bare driver's bulk rate: both in one
// transaction, turn by turn a thousand, so that what else the machine does falls on both.
func BenchmarkAddAll(b *testing.B) {
	const n = 100_000
	t := benchTrial()
	at := timeText(t.At)
	var both, bares time.Duration
	for b.Loop() {
		lb, x := openTemp(b), openBare(b)
		start := time.Now()
		x.exec(b, "BEGIN IMMEDIATE")
		thousand := func(int) {
			start := time.Now()
			for range 1000 {
				x.add(b, &t, at)
			}
			bares += time.Since(start)
		}
		if got, err := lb.AddAll(b.Context(), repeat(t, n), thousand); got != n || err != nil {
			b.Fatal(got, err)
		}
		middle := time.Now()
		x.exec(b, "COMMIT")
		bares += time.Since(middle)
		both += time.Since(start)
	}
	ours := both - bares
	b.ReportMetric(float64(n*b.N)/ours.Seconds(), "trials/s")
	b.ReportMetric(float64(n*b.N)/bares.Seconds(), "bare/s")
	b.ReportMetric(bares.Seconds()/ours.Seconds(), "of-bare-rate")
}

// BenchmarkTrials streams 100,000 trials with five readings.
func BenchmarkTrials(b *testing.B) {
	const n = 100_000
	lb := openTemp(b)
	if _, err := lb.AddAll(b.Context(), repeat(benchTrial(), n), nil); err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		for _, err := range lb.Trials(b.Context(), Scope{}) {
			if err != nil {
				b.Fatal(err)
			}
		}
	}
	b.ReportMetric(float64(n*b.N)/b.Elapsed().Seconds(), "trials/s")
}

func repeat(t snubber.Trial, n int) func(func(snubber.Trial, error) bool) {
	return func(yield func(snubber.Trial, error) bool) {
		for range n {
			if !yield(t, nil) {
				return
			}
		}
	}
}

// BenchmarkAudit audits 100,000 trials with five readings each: rows are those of trials alone.
func BenchmarkAudit(b *testing.B) {
	const n = 100_000
	lb := openTemp(b)
	if _, err := lb.AddAll(b.Context(), repeat(benchTrial(), n), nil); err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		if r, err := lb.Audit(b.Context(), nil); err != nil || !r.Sound() || r.Trials != n {
			b.Fatal(r, err)
		}
	}
	b.ReportMetric(float64(n*b.N)/b.Elapsed().Seconds(), "trials/s")
	b.ReportMetric(float64(n*b.N)*7/b.Elapsed().Seconds(), "rows/s") // a trial's own, five readings, its link
}
