package waveform

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"
)

// bench is the edge that the captures below are of: a step of 48 V that rings, through a Gaussian response.
type bench struct {
	n             int
	edge          float64 // samples before the edge
	period, decay float64 // samples
	rise          float64 // samples, from 10 % to 90 % of the Gaussian response
	down          bool
}

func (b bench) at(t float64) float64 {
	sigma := b.rise / 2.563
	pole := complex(-1/b.decay, 2*math.Pi/b.period)
	v := 0.0
	switch far := 7 * sigma; {
	case t < -far:
	case t > far: // the Gaussian only scales an exponential
		v = 1 - real(cmplx.Exp(pole*complex(t, 0)+pole*pole*complex(sigma*sigma/2, 0)))
	default:
		for i := -100; i <= 100; i++ {
			x := 7 * float64(i) / 100
			if u := t - x*sigma; u > 0 {
				v += (1 - real(cmplx.Exp(pole*complex(u, 0)))) * math.Exp(-x*x/2) / math.Sqrt(2*math.Pi) * 0.07
			}
		}
	}
	if b.down {
		v = 1 - v
	}
	return 48 * v
}

// capture is the edge as seen with a trigger late by so many samples.
func (b bench) capture(late, noise float64, random *rand.Rand) Record {
	r := Record{Start: -b.edge * 1e-9, Interval: 1e-9, Volts: make([]float64, b.n)}
	for i := range r.Volts {
		r.Volts[i] = b.at(float64(i) - b.edge + late)
		if noise > 0 {
			r.Volts[i] += noise * random.NormFloat64()
		}
	}
	return r
}

var usual = bench{n: 2000, edge: 400, period: 20, decay: 120, rise: 6}

// ringAt is the amplitude at the ring's frequency over ten cycles from a sample.
func ringAt(v []float64, from int, period float64) float64 {
	var sum complex128
	n := 10 * int(period)
	mean := meanOf(v[from : from+n])
	for i, x := range v[from : from+n] {
		sum += complex(x-mean, 0) * cmplx.Rect(1, -2*math.Pi*float64(i)/period)
	}
	return cmplx.Abs(sum) * 2 / float64(n)
}

// Sixteen captures whose trigger is anywhere within three samples, beside what the first would be without noise: the noise that
// is left is a quarter, and the ring keeps its amplitude but for the jitter that is left.
func TestAverageMonteCarlo(t *testing.T) {
	const captures, trials = 16, 10
	for _, noise := range []float64{0, 0.5, 2.4} {
		left, kept, off := 0.0, 0.0, 0.0
		for trial := range trials {
			random := rand.New(rand.NewPCG(7, uint64(trial)))
			late := 3 * random.Float64()
			records := []Record{usual.capture(late, noise, random)}
			for len(records) < captures {
				r := usual.capture(3*random.Float64(), noise, random)
				r.Start += 1e-7 * random.Float64() // the trigger's word is not relied on
				records = append(records, r)
			}
			mean, err := Average(records)
			if err != nil {
				t.Fatal(err)
			}
			clean := usual.capture(late, 0, nil)
			from := int(math.Round((mean.Start - clean.Start) / 1e-9))
			off = max(off, math.Abs(mean.Start-clean.TimeAt(from)))
			square := 0.0
			for i := 1000; i < 1900; i++ {
				d := mean.Volts[i-from] - clean.Volts[i]
				square += d * d / 900
			}
			left += math.Sqrt(square) / trials
			kept += (ringAt(mean.Volts, 420-from, usual.period)/ringAt(clean.Volts, 420, usual.period) - 1) / trials
		}
		t.Logf("noise %g V: %.4g V left, the ring's amplitude %+.2g", noise, left, kept)
		want := noise / math.Sqrt(captures)
		// The interpolation takes a few per cent off white noise, near half the sampling rate.
		if left > 1.02*want+1e-5 || left < 0.95*want {
			t.Errorf("noise %g V: %g V left, want %g", noise, left, want)
		}
		// Noise in the amplitude over 200 samples, of the mean of 10 trials, three times; and 1e-4 for the jitter.
		if most := 3*want*math.Sqrt(2./200/trials)/20 + 1e-4; math.Abs(kept) > most {
			t.Errorf("noise %g V: the ring's amplitude is %+.2g off, at most %.2g", noise, kept, most)
		}
		if off > 1e-15 {
			t.Errorf("noise %g V: the times are %g s off the first record's", noise, off)
		}
	}
}

// Two captures are each other's only help.
func TestAverageOfTwo(t *testing.T) {
	clean := usual.capture(0, 0, nil)
	mean, err := Average([]Record{clean, usual.capture(-7.37, 0, nil)})
	if err != nil {
		t.Fatal(err)
	}
	from := int(math.Round((mean.Start - clean.Start) / 1e-9))
	for i, v := range mean.Volts {
		if math.Abs(v-clean.Volts[from+i]) > 2e-3 {
			t.Fatalf("sample %d: %g V, want %g V", from+i, v, clean.Volts[from+i])
		}
	}
}

// The shifts themselves: their scatter is at most 1.4 times the least that noise allows, sigma / sqrt(sum of slopes squared)
// for each of the two records.
func TestRefinedShift(t *testing.T) {
	for _, b := range []bench{usual, {n: 4000, edge: 800, period: 100, decay: 500, rise: 30}, {n: 1000, edge: 200, period: 6, decay: 40, rise: 4}, {n: 2000, edge: 300, period: 20, decay: 120, rise: 6, down: true}} {
		slopes := 0.0
		for i := range b.n {
			x := float64(i) - b.edge
			d := (b.at(x+0.01) - b.at(x-0.01)) / 0.02
			slopes += d * d
		}
		for _, noise := range []float64{1e-3, 0.5, 2.4} {
			square, mean, worst := 0.0, 0.0, 0.0
			const trials = 60
			for trial := range trials {
				random := rand.New(rand.NewPCG(8, uint64(trial)))
				late := 40*random.Float64() - 20
				ref, v := b.capture(0, noise, random), b.capture(-late, noise, random)
				lag := newCorrelator(ref.Volts, len(v.Volts)).lag(v.Volts)
				off := newRefiner(ref.Volts).shift(v.Volts, float64(lag)) - late
				square += off * off / trials
				mean += off / trials
				worst = max(worst, math.Abs(off))
			}
			bound := math.Sqrt2 * noise / math.Sqrt(slopes)
			t.Logf("period %g, noise %g: sd %.3g samples, %.2f of the bound; mean %.2g", b.period, noise, math.Sqrt(square), math.Sqrt(square)/bound, mean)
			if math.Sqrt(square) > 1.4*bound+2e-4 || worst > 5*bound+1e-3 {
				t.Errorf("period %g, noise %g: sd %g samples, bound %g, worst %g", b.period, noise, math.Sqrt(square), bound, worst)
			}
		}
	}
}

// What has so many samples per cycle comes through a shift with this error at most, of its amplitude.
func TestShiftWeights(t *testing.T) {
	v := make([]float64, 200)
	for _, c := range []struct{ period, most float64 }{{3, 1e-5}, {4, 1e-5}, {5, 1e-5}, {20, 1e-5}, {1e9, 1e-12}} {
		worst := 0.0
		for _, fraction := range []float64{0, 0.1, 0.25, 0.5, 0.77, 0.999} {
			for i := range v {
				v[i] = math.Cos(2*math.Pi*float64(i)/c.period + 0.4)
			}
			dst := make([]float64, 120)
			addShifted(dst, v, 20+fraction, 1)
			for k, x := range dst {
				worst = max(worst, math.Abs(x-math.Cos(2*math.Pi*(float64(k)+20+fraction)/c.period+0.4)))
			}
		}
		t.Logf("%g samples per cycle: %.2g", c.period, worst)
		if worst > c.most {
			t.Errorf("%g samples per cycle: %g off, want %g", c.period, worst, c.most)
		}
	}
}

func TestAverageErrors(t *testing.T) {
	random := rand.New(rand.NewPCG(9, 1))
	good := usual.capture(0, 0.5, random)
	other := func(change func(*Record)) []Record {
		r := usual.capture(1, 0.5, random)
		r.Origin = "third.csv"
		change(&r)
		return []Record{good, usual.capture(0.4, 0.5, random), r}
	}
	falling := usual
	falling.down = true
	slow := usual
	slow.period, slow.decay = 90, 400
	for name, c := range map[string]struct {
		records []Record
		want    string
	}{
		"none":           {nil, "there are none"},
		"NaN":            {other(func(r *Record) { r.Volts[7] = math.NaN() }), "capture 3 of 3 (third.csv): sample 8"},
		"interval":       {other(func(r *Record) { r.Interval = 1.00001e-9 }), "capture 3 of 3 (third.csv): its interval is 1.00001e-09 s"},
		"short":          {other(func(r *Record) { r.Volts = r.Volts[:63] }), "capture 3 of 3 (third.csv): it has 63 samples"},
		"noise alone":    {other(func(r *Record) { r.Volts = gauss(2000, 9) }), "capture 3 of 3 (third.csv): it is not of the first's edge"},
		"constant":       {other(func(r *Record) { clear(r.Volts) }), "capture 3 of 3 (third.csv): it has no edge"},
		"falling":        {other(func(r *Record) { r.Volts = falling.capture(0, 0.5, random).Volts }), "capture 3 of 3 (third.csv): it is not of the first's edge"},
		"three times":    {other(func(r *Record) { scale(r.Volts, 3) }), "its swing is 3"},
		"first constant": {[]Record{{Interval: 1e-9, Volts: count(1, 2000)}, good}, "capture 2 of 2: the first capture has no edge"},
		"first zero":     {[]Record{{Interval: 1e-9, Volts: make([]float64, 2000)}, good}, "capture 1 of 2: it has no edge"},
		"no overlap":     {[]Record{cut(good, 350, 430), cut(good, 380, 460)}, "in common"},
	} {
		r, err := Average(c.records)
		if err == nil || !strings.Contains(err.Error(), c.want) || !strings.HasPrefix(err.Error(), "averaging ") {
			t.Errorf("%s: %d samples, %v", name, len(r.Volts), err)
		}
	}
	one, err := Average([]Record{good})
	if err != nil || len(one.Volts) != len(good.Volts)-shiftTaps+1 || one.Volts[100] != good.Volts[115] || one.Start != good.TimeAt(15) {
		t.Errorf("one alone: %v, %d samples", err, len(one.Volts))
	}
}

func scale(v []float64, by float64) {
	for i := range v {
		v[i] *= by
	}
}

func cut(r Record, from, to int) Record {
	r.Start, r.Volts = r.TimeAt(from), r.Volts[from:to]
	return r
}

// Captures of other lengths and far apart: the samples that all have are averaged.
func TestAverageOverlap(t *testing.T) {
	random := rand.New(rand.NewPCG(9, 2))
	records := []Record{usual.capture(0, 0.1, random), usual.capture(300.3, 0.1, random), usual.capture(-500.6, 0.1, random)}
	records[1].Volts = records[1].Volts[:1500]
	mean, err := Average(records)
	if err != nil {
		t.Fatal(err)
	}
	from := int(math.Round((mean.Start - records[0].Start) / 1e-9))
	// The second begins 300.3 samples into the first, the third ends 500.6 before it.
	if from < 315 || from > 317 || len(mean.Volts) < 1166 || len(mean.Volts) > 1170 {
		t.Errorf("from sample %d, %d samples", from, len(mean.Volts))
	}
	for k, v := range mean.Volts {
		if math.Abs(v-usual.at(float64(k+from)-usual.edge)) > 0.45 {
			t.Fatalf("sample %d: %g V, want %g V", k+from, v, usual.at(float64(k+from)-usual.edge))
		}
	}
}

func BenchmarkAverage(b *testing.B) {
	for _, n := range []int{10_000, 1_000_000} {
		random := rand.New(rand.NewPCG(9, 3))
		e := bench{n: n, edge: float64(n) / 5, period: 20, decay: 120, rise: 6}
		var records []Record
		for range 16 {
			records = append(records, e.capture(3*random.Float64(), 0.5, random))
		}
		b.Run(fmt.Sprintf("16x%d", n), func(b *testing.B) {
			b.ReportAllocs()
			b.SetBytes(int64(16 * 8 * n))
			for b.Loop() {
				if _, err := Average(records); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
