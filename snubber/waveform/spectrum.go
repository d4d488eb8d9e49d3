package waveform

import (
	"fmt"
	"math"
)

// Window weighs the samples before the transform.
type Window int

const (
	// Hann is (1 - cos(2 pi i / n)) / 2: J. F. Harris, On the Use of Windows for Harmonic Analysis with the Discrete Fourier
	// Transform, Proc. IEEE 66, 51 (1978), table 1: noise bandwidth 1.5 bins, 1.42 dB lost half-way between bins
	// (attribution from memory).
	Hann Window = iota
	// NoWindow weighs all samples alike: for a record that begins and ends at the same level. Noise bandwidth 1 bin, 3.92 dB
	// lost half-way between bins.
	NoWindow
)

func (w Window) String() string {
	switch w {
	case Hann:
		return "Hann"
	case NoWindow:
		return "none"
	}
	return fmt.Sprintf("Window(%d)", int(w))
}

// weight of sample i of n.
func (w Window) weight(i, n int) float64 {
	if w == NoWindow {
		return 1
	}
	sin := math.Sin(math.Pi * float64(i) / float64(n))
	return sin * sin // as (1 - cos) / 2, without its cancellation
}

// sums of the weights and of their squares, over n of them.
func (w Window) sums(n int) (sum, squares float64) {
	switch {
	case w == NoWindow:
		return float64(n), float64(n)
	case n == 2:
		return 1, 1
	}
	return float64(n) / 2, 3 * float64(n) / 8
}

// Spectrum is the amplitude spectrum of a record. It shows where in frequency a record's voltage lies; ring frequency and
// decay are read from the samples, not from here.
//
//	Volts[k] = |sum over i of w[i] (v[i] - mean) exp(-2 pi j k i / len)| g / sum of w
//
// is the rms voltage of the sinusoid that would give this line: g is sqrt(2), and 1 at 0 Hz and at half the sampling rate.
// Over 1 uV rms this is the dB(uV) in which receivers of CISPR 16-1-1 are calibrated (attribution from memory); their
// bandwidths and detectors are not imitated. A ring that dies out gives a line that falls as the record gets longer, and
// that the window weighs by where in the record it stands: compare records of one duration with the edge at one place.
type Spectrum struct {
	StepHz      float64   // Hz, > 0: from one line to the next; line 0 is at 0 Hz
	Volts       []float64 // V rms, up to half the sampling rate
	BandwidthHz float64   // Hz: of the noise that a line takes in
	Window      Window
}

// SpectrumOf is the spectrum of a record of 2 samples or more, its mean taken off. Zeros make the samples up to the next
// number without a prime factor above 5, and to twice as many where they are 131,072 or fewer: this brings the lines closer
// and leaves their height.
func SpectrumOf(r Record, w Window) (Spectrum, error) {
	if err := r.Check(); err != nil {
		return Spectrum{}, err
	}
	n := len(r.Volts)
	switch {
	case w != Hann && w != NoWindow:
		return Spectrum{}, fmt.Errorf("spectrum with %v: use Hann or NoWindow", w)
	case n < 2:
		return Spectrum{}, fmt.Errorf("spectrum of one sample: it needs two or more")
	}
	sum, squares := w.sums(n)
	length := spectrumLength(n)
	s := Spectrum{
		StepHz:      1 / (float64(length) * r.Interval),
		BandwidthHz: squares / (sum * sum * r.Interval),
		Window:      w,
	}
	mean := meanOf(r.Volts)
	s.Volts = magnitudes(length, func(i int) float64 {
		if i >= n {
			return 0
		}
		return (r.Volts[i] - mean) * w.weight(i, n) / sum
	})
	for k := range s.Volts {
		if k > 0 && 2*k < length {
			s.Volts[k] *= math.Sqrt2
		}
		if !(s.Volts[k] <= math.MaxFloat64) {
			return Spectrum{}, fmt.Errorf("spectrum: the record's voltages, up to %g V, are too large to add", peakOf(r.Volts))
		}
	}
	if !(s.StepHz > 0) || math.IsInf(s.StepHz*float64(length), 0) {
		return Spectrum{}, fmt.Errorf("spectrum: an interval of %g s gives no frequency that float64 holds", r.Interval)
	}
	return s, nil
}

// spectrumLength is the length of the transform of n samples.
func spectrumLength(n int) int {
	if n <= splitAbove {
		return fastLength(2 * n)
	}
	return fastLength(n)
}

func meanOf(v []float64) float64 {
	sum := 0.0
	for _, x := range v {
		sum += x
	}
	if !math.IsInf(sum, 0) {
		return sum / float64(len(v))
	}
	mean := 0.0
	for _, x := range v {
		mean += x / float64(len(v))
	}
	return mean
}

func peakOf(v []float64) float64 {
	peak := 0.0
	for _, x := range v {
		peak = max(peak, math.Abs(x))
	}
	return peak
}

// DBuV is a level in dB over 1 uV rms. Below 1 fV, as at 0 V, it is -180.
func DBuV(volts float64) float64 { return 20 * math.Log10(max(volts, leastVolts)/1e-6) }

const leastVolts = 1e-15
