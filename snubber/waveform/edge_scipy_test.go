package waveform_test

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"ringbook/snubber/scipytest"
	"ringbook/snubber/waveform"
)

type curveFits struct {
	Fits []struct {
		Hz, D [2]float64
	}
	Seconds float64
}

// tenTimes is the record whose fit is timed: 10,000 samples of a ring of Q 30, of which it is seen in nearly all, and a start some
// parts in a thousand off.
func tenThousand() (m made, r waveform.Record, hz, d float64) {
	m = made{hz: 30e6, q: 30, amp: 10, phi: 0.4, to: 48, perCycle: 100, n: 10000, noise: 0.1}
	r, _ = m.record(rand.New(rand.NewPCG(4, 4)))
	_, d = m.rate()
	return m, r, m.hz * 1.0005, d * 1.02
}

// curveFit asks SciPy's curve_fit for the same samples.
func curveFit(t testing.TB, records []waveform.Record, starts [][]float64, repeat int) curveFits {
	t.Helper()
	var rows []map[string]any
	for i, r := range records {
		rows = append(rows, map[string]any{"v": r.Volts, "dt": r.Interval, "start": starts[i]})
	}
	var out curveFits
	scipytest.Run(t, "testdata/curvefit.py", map[string]any{"records": rows, "repeat": repeat}, &out)
	return out
}

// Frequency, decay and their standard uncertainties beside SciPy's curve_fit on the very samples that ReadEdge chose.
func TestEdgeAgainstSciPy(t *testing.T) {
	var edges []waveform.Edge
	var records []waveform.Record
	var starts [][]float64
	for seed := range 24 {
		rng := rand.New(rand.NewPCG(uint64(seed), 11))
		m := made{hz: 1e6 * math.Pow(10, 2*rng.Float64()), q: []float64{3, 5, 10, 30}[seed%4], amp: 5, phi: 6 * rng.Float64(), to: 20,
			perCycle: 15 + 50*rng.Float64(), before: 200, n: 2500, noise: 5 * []float64{0.05, 0.02, 0.005}[seed%3]}
		r, edge := m.record(rng)
		e := readEdge(t, r)
		if !e.Ringing || e.DecayS == nil {
			t.Fatalf("seed %d: no ring", seed)
		}
		from, to := int(math.Round((e.FitFrom-r.Start)/r.Interval)), int(math.Round((e.FitTo-r.Start)/r.Interval))
		w, d := m.rate()
		late := e.FitFrom - edge
		starts = append(starts, []float64{m.to, m.amp * math.Exp(-d*late), m.phi + w*late, w, d})
		r.Volts = r.Volts[from : to+1]
		edges, records = append(edges, e), append(records, r)
	}
	for i, want := range curveFit(t, records, starts, 0).Fits {
		e := edges[i]
		if off := math.Abs(e.RingHz.Value-want.Hz[0]) / want.Hz[1]; off > 0.01 {
			t.Errorf("record %d: ring_hz %g, SciPy %g: %.3f standard uncertainties apart", i, e.RingHz.Value, want.Hz[0], off)
		}
		if off := math.Abs(1/e.DecayS.Value-want.D[0]) / want.D[1]; off > 0.01 {
			t.Errorf("record %d: 1/decay_s %g, SciPy %g: %.3f standard uncertainties apart", i, 1/e.DecayS.Value, want.D[0], off)
		}
		near(t, "u(ring_hz)", e.RingHz.U, want.Hz[1], 0.02)
		near(t, "u(1/decay_s)", e.DecayS.U/e.DecayS.Value/e.DecayS.Value, want.D[1], 0.02)
	}
}

// 10,000 samples beside SciPy's curve_fit on the same samples in the same run: the fit alone from the same start, and the
// whole of ReadEdge, which finds edge, start and order by itself.
func BenchmarkEdgeBesideSciPy(b *testing.B) {
	m, r, hz, d := tenThousand()
	scipy := curveFit(b, []waveform.Record{r}, [][]float64{{m.to, m.amp, m.phi, 2 * math.Pi * hz, d}}, 5)
	report := func(b *testing.B) {
		b.ReportMetric(scipy.Seconds*1e3, "scipy-ms/op")
		b.ReportMetric(scipy.Seconds/(b.Elapsed().Seconds()/float64(b.N)), "times-faster")
	}
	b.Run("same-start", func(b *testing.B) {
		for b.Loop() {
			got, _, ok := waveform.PlainFit(context.Background(), r, hz, 1/d)
			if !ok || math.Abs(got-scipy.Fits[0].Hz[0]) > 0.01*scipy.Fits[0].Hz[1] {
				b.Fatalf("%g Hz, SciPy %g", got, scipy.Fits[0].Hz[0])
			}
		}
		report(b)
	})
	b.Run("whole-edge", func(b *testing.B) {
		for b.Loop() {
			if _, err := waveform.ReadEdge(context.Background(), r, waveform.Options{}); err != nil {
				b.Fatal(err)
			}
		}
		report(b)
	})
}

// Ten million samples: the time of a sample and the bytes taken beside the record's own (80 MB).
func BenchmarkEdgeTenMillion(b *testing.B) {
	m := made{hz: 1e6, q: 30, amp: 10, phi: 1, perCycle: 1e5, n: 10_000_000, before: 1_000_000, to: 48, noise: 0.2}
	r, _ := m.record(rand.New(rand.NewPCG(5, 6)))
	b.ReportAllocs()
	for b.Loop() {
		if e, err := waveform.ReadEdge(context.Background(), r, waveform.Options{}); err != nil || !e.Ringing {
			b.Fatal(err, e.Warnings)
		}
	}
	b.ReportMetric(b.Elapsed().Seconds()/float64(b.N)/float64(m.n)*1e9, "ns/sample")
}
