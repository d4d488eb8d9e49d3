package waveform

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/dsp/fourier"

	"ringbook/snubber/scipytest"
)

func sinusoid(n int, interval, amplitude, hz, phase, offset float64) Record {
	r := Record{Interval: interval, Volts: make([]float64, n)}
	for i := range r.Volts {
		r.Volts[i] = offset + amplitude*math.Cos(2*math.Pi*hz*float64(i)*interval+phase)
	}
	return r
}

func spectrumOf(t testing.TB, r Record, w Window) Spectrum {
	t.Helper()
	s, err := SpectrumOf(r, w)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// A sinusoid reads its rms voltage at a line, and 1.42 dB (Hann) or 3.92 dB (none) less half-way between two: Harris 1978,
// table 1, from memory.
func TestSpectrumOfASinusoid(t *testing.T) {
	const n, interval = 4000, 1e-9
	for _, c := range []struct {
		window             Window
		lost, low, off, bw float64
	}{{Hann, 1.42, 0.02, 0.02, 1.5}, {NoWindow, 3.92, 0.28, 0.1, 1}} {
		for _, between := range []float64{0, 0.1, 0.25, 0.3, 0.5, 0.75, 0.8} {
			hz := (200 + between) / (n * interval)
			s := spectrumOf(t, sinusoid(n, interval, 3, hz, 0.7, 48), c.window)
			if math.Abs(s.StepHz*n*interval-0.5) > 1e-12 || len(s.Volts) != n+1 || math.Abs(s.BandwidthHz*n*interval-c.bw) > 1e-12 {
				t.Fatalf("%v: step %g, %d lines, bandwidth %g", c.window, s.StepHz, len(s.Volts), s.BandwidthHz)
			}
			want := DBuV(3 / math.Sqrt2)
			if got := DBuV(s.Volts[400]); between == 0 && math.Abs(got-want) > 1e-6 {
				t.Errorf("%v at a line: %g dBuV, want %g", c.window, got, want)
			} else if between == 0.5 && math.Abs(want-got-c.lost) > 0.02 {
				t.Errorf("%v half-way: %g dB lost, want %g", c.window, want-got, c.lost)
			}
			line, ok := s.Line(hz * 1.05)
			if !ok || math.Abs(DBuV(line.Volts)-want) > c.low || math.Abs(line.Hz-hz) > c.off*s.StepHz {
				t.Errorf("%v at %g: line %+v %v, %g dB and %g lines off", c.window, 200+between, line, ok, DBuV(line.Volts)-want, (line.Hz-hz)/s.StepHz)
			}
		}
	}
	if got := DBuV(1); math.Abs(got-120) > 1e-12 {
		t.Errorf("1 V is %g dBuV", got)
	}
}

// Parseval: without a window, the squares of the lines add up to the mean square about the mean.
func TestSpectrumKeepsPower(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 10))
	for _, n := range []int{2, 3, 100, 1009, 4096, splitAbove + 1, 200_000} {
		r := Record{Interval: 1e-9, Volts: make([]float64, n)}
		mean, square := 0.0, 0.0
		for i := range r.Volts {
			r.Volts[i] = 5 + random.NormFloat64()
			mean += r.Volts[i] / float64(n)
		}
		for _, v := range r.Volts {
			square += (v - mean) * (v - mean) / float64(n)
		}
		s, sum := spectrumOf(t, r, NoWindow), 0.0
		for _, v := range s.Volts {
			sum += v * v
		}
		padded := math.Round(1 / (s.StepHz * r.Interval))
		if got := sum * float64(n) / padded; math.Abs(got/square-1) > 1e-10 {
			t.Errorf("n = %d: mean square %g, want %g", n, got, square)
		}
	}
}

func TestSpectrumAgainstSciPy(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 11))
	for _, n := range []int{1000, 1013, 4001} { // 1013 and 4001 are prime: zeros are added
		r := sinusoid(n, 0.5e-9, 3, 52.3e6, 0.7, 48)
		for i := range r.Volts {
			r.Volts[i] = r.Volts[i]*math.Exp(-float64(i)/300) + 0.1*random.NormFloat64()
		}
		for w, name := range map[Window]string{Hann: "hann", NoWindow: "boxcar"} {
			s := spectrumOf(t, r, w)
			var want struct{ Hz, Volts []float64 }
			in := map[string]any{"volts": r.Volts, "interval": r.Interval, "window": name, "length": spectrumLength(n)}
			scipytest.Run(t, "testdata/spectrum.py", in, &want)
			if len(want.Volts) != len(s.Volts) {
				t.Fatalf("n = %d: %d lines, SciPy %d", n, len(s.Volts), len(want.Volts))
			}
			for k, v := range want.Volts {
				if math.Abs(s.Volts[k]-v) > 1e-12 || math.Abs(float64(k)*s.StepHz-want.Hz[k]) > 1e-9*want.Hz[len(want.Hz)-1] {
					t.Fatalf("n = %d, %v, line %d: %g V at %g Hz, SciPy %g V at %g Hz", n, w, k, s.Volts[k], float64(k)*s.StepHz, v, want.Hz[k])
				}
			}
		}
	}
}

// The Fourier integral of A exp(-d t) cos(w t + p) from t = 0 is A (exp(jp) / (d + j(u - w)) + exp(-jp) / (d + j(u + w))) / 2.
func TestSpectrumOfARing(t *testing.T) {
	const n, interval, a, hz, d, p = 20000, 0.1e-9, 5.0, 50e6, 1e7, 0.3
	r := sinusoid(n, interval, a, hz, p, 0)
	for i := range r.Volts {
		r.Volts[i] *= math.Exp(-d * float64(i) * interval)
	}
	s := spectrumOf(t, r, NoWindow)
	at := func(f float64) float64 {
		u, w := 2*math.Pi*f, 2*math.Pi*hz
		x := complex(math.Cos(p), math.Sin(p))/complex(d, u-w) + complex(math.Cos(p), -math.Sin(p))/complex(d, u+w)
		return a / 2 * math.Hypot(real(x), imag(x)) * math.Sqrt2 / (n * interval)
	}
	for _, f := range []float64{20e6, 45e6, 50e6, 50.1e6, 55e6, 120e6} {
		got, err := s.At(f)
		if err != nil || math.Abs(got/at(f)-1) > 0.015 { // the sum stands for the integral to d * interval, and half a sample at t = 0
			t.Errorf("%g Hz: %g V (%v), want %g V", f, got, err, at(f))
		}
	}
	line, ok := s.Line(48e6)
	if !ok || math.Abs(line.Hz/hz-1) > 2e-3 || math.Abs(line.Volts/at(hz)-1) > 0.01 {
		t.Errorf("line %+v %v, want %g V", line, ok, at(hz))
	}
}

func TestDifference(t *testing.T) {
	const hz = 50.3e6
	before := spectrumOf(t, sinusoid(4000, 1e-9, 8, hz, 0.2, 12), Hann)
	after := spectrumOf(t, sinusoid(4000, 1e-9, 2, hz, 1.2, 48), Hann)
	want := 20 * math.Log10(2./8)
	for _, f := range []float64{hz, 50e6, 50.4e6} {
		if db, err := DifferenceAt(before, after, f); err != nil || math.Abs(db-want) > 1e-3 {
			t.Errorf("at %g Hz: %g dB, want %g (%v)", f, db, want, err)
		}
	}
	c, err := Difference(before, after)
	if err != nil || len(c.DB) != 4001 || c.StepHz != before.StepHz || math.Abs(c.DB[402]-want) > 1e-3 {
		t.Errorf("%d lines of %g Hz, %g dB at the ring: %v", len(c.DB), c.StepHz, c.DB[402], err)
	}
	// Another rate, a number of samples that zeros are added to: between its lines the parabola is 0.02 dB off at most.
	other := spectrumOf(t, sinusoid(8009, 0.4995e-9, 2, hz, 1.2, 48), Hann)
	if other.StepHz == before.StepHz {
		t.Fatal("no other lines")
	}
	if c, err = Difference(before, other); err != nil || math.Abs(c.DB[402]-want) > 0.02 || math.Abs(float64(len(c.DB)-1)*c.StepHz-500e6) > c.StepHz {
		t.Errorf("another rate: %d lines of %g Hz, %g dB at the ring: %v", len(c.DB), c.StepHz, c.DB[402], err)
	}
	for name, s := range map[string]Spectrum{
		"duration": spectrumOf(t, sinusoid(5000, 1e-9, 2, hz, 0, 0), Hann),
		"window":   spectrumOf(t, sinusoid(4000, 1e-9, 2, hz, 0, 0), NoWindow),
	} {
		if _, err := Difference(before, s); err == nil || !strings.Contains(err.Error(), name) {
			t.Errorf("another %s: %v", name, err)
		}
	}
	if _, err := DifferenceAt(before, after, 501e6); err == nil || !strings.Contains(err.Error(), "reaches from 0 Hz") {
		t.Errorf("beyond half the rate: %v", err)
	}
}

func TestSpectrumBadInput(t *testing.T) {
	for _, r := range []Record{{}, {Interval: 1}, {Interval: 1, Volts: []float64{1}}, {Interval: 1, Volts: []float64{1, math.NaN()}},
		{Interval: 1, Volts: []float64{1.7e308, -1.7e308, 1.7e308}}, {Interval: 5e-324, Volts: []float64{1, 2}}} {
		if s, err := SpectrumOf(r, Hann); err == nil {
			t.Errorf("%+v: %+v", r, s)
		}
	}
	s := spectrumOf(t, Record{Interval: 1, Volts: []float64{4, 4, 4, 4, 4}}, Hann)
	if line, ok := s.Line(0.2); ok {
		t.Errorf("a constant has the line %+v", line)
	}
	for _, hz := range []float64{0, -1, math.NaN(), math.Inf(1), 1e300} {
		if line, ok := s.Line(hz); ok {
			t.Errorf("at %g Hz: %+v", hz, line)
		}
		if _, err := s.At(hz); err == nil && hz != 0 {
			t.Errorf("at %g Hz: no error", hz)
		}
	}
}

func TestFastLength(t *testing.T) {
	smooth := func(n int) bool {
		for _, p := range []int{2, 3, 5} {
			for n%p == 0 {
				n /= p
			}
		}
		return n == 1
	}
	for _, n := range []int{1, 2, 3, 7, 11, 97, 1009, 1013, 4001, 65537, 99991} {
		want := n
		for !smooth(want) {
			want++
		}
		if got := fastLength(n); got != want {
			t.Errorf("%d: %d, want %d", n, got, want)
		}
	}
	for _, n := range []int{splitAbove + 1, 1_000_003, 10_000_019} {
		if got := fastLength(n); got < n || got > n+n/10 || got%16 != 0 || !smooth(got) {
			t.Errorf("%d: %d", n, got)
		}
	}
}

// The joined transform is the whole one.
func TestMagnitudes(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 12))
	n := fastLength(splitAbove + 1)
	v := make([]float64, n)
	for i := range v {
		v[i] = random.NormFloat64()
	}
	whole := fourier.NewFFT(n).Coefficients(nil, v)
	got := magnitudes(n, func(i int) float64 { return v[i] })
	if len(got) != len(whole) {
		t.Fatalf("%d lines, want %d", len(got), len(whole))
	}
	for k, x := range whole {
		if want := math.Hypot(real(x), imag(x)); math.Abs(got[k]-want) > 1e-9 {
			t.Fatalf("line %d: %g, want %g", k, got[k], want)
		}
	}
}

func BenchmarkSpectrumOf(b *testing.B) {
	for _, n := range []int{10_000, 1_000_000, 10_000_000} {
		r := sinusoid(n, 1e-9, 3, 50e6, 0, 0)
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			b.ReportAllocs()
			b.SetBytes(int64(8 * n))
			for b.Loop() {
				spectrumOf(b, r, Hann)
			}
		})
	}
}
