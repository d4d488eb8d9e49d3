package waveform

import (
	"fmt"
	"math"
)

// Line is a peak of a spectrum.
type Line struct {
	Hz    float64
	Volts float64 // V rms
}

// Line is the ring's line: the highest peak within 10 % of ringHz or two bandwidths of it, whichever is the wider. Place and
// height are those of the parabola through the decibels of the three lines around the top (common practice): on a pure
// sinusoid in up to 131,072 samples at most 0.02 dB and 0.02 lines off with Hann, 0.3 dB and 0.1 lines with no window. ok is
// false where no line there is above both its neighbours.
func (s Spectrum) Line(ringHz float64) (line Line, ok bool) {
	reach := max(0.1*ringHz, 2*s.BandwidthHz)
	from := max(1, math.Ceil((ringHz-reach)/s.StepHz))
	to := min(float64(len(s.Volts)-2), math.Floor((ringHz+reach)/s.StepHz))
	if !(from <= to) || !(ringHz > 0) {
		return Line{}, false
	}
	top := 0
	for k := int(from); k <= int(to); k++ {
		if s.Volts[k] > s.Volts[k-1] && s.Volts[k] >= s.Volts[k+1] && (top == 0 || s.Volts[k] > s.Volts[top]) {
			top = k
		}
	}
	if top == 0 {
		return Line{}, false
	}
	a, b, c := s.parabola(top)
	x := max(-0.5, min(0.5, -b/(2*a)))
	return Line{(float64(top) + x) * s.StepHz, 1e-6 * math.Pow(10, (c+x*(b+x*a))/20)}, true
}

// At is the amplitude at a frequency between the lines, V rms, by the parabola through the decibels of the three nearest;
// an error where the spectrum does not reach.
func (s Spectrum) At(hz float64) (float64, error) {
	last := len(s.Volts) - 1
	if !(hz >= 0 && hz <= float64(last)*s.StepHz*(1+1e-9)) {
		return 0, fmt.Errorf("the spectrum reaches from 0 Hz to %g Hz: it has nothing at %g Hz", float64(last)*s.StepHz, hz)
	}
	k := hz / s.StepHz
	near := int(math.Round(k))
	if math.Abs(k-float64(near)) < 1e-9 || last < 2 {
		return s.Volts[min(near, last)], nil
	}
	near = max(1, min(near, last-1))
	a, b, c := s.parabola(near)
	x := k - float64(near)
	return 1e-6 * math.Pow(10, (c+x*(b+x*a))/20), nil
}

// parabola a x^2 + b x + c through the dB(uV) of the lines k - 1, k, k + 1 at x = -1, 0, 1.
func (s Spectrum) parabola(k int) (a, b, c float64) {
	left, mid, right := DBuV(s.Volts[k-1]), DBuV(s.Volts[k]), DBuV(s.Volts[k+1])
	return (left+right)/2 - mid, (right - left) / 2, mid
}

// Change is how much one spectrum lies above another.
type Change struct {
	StepHz float64   // Hz, > 0: from one line to the next; line 0 is at 0 Hz
	DB     []float64 // dB: positive where the second is the higher
}

// Difference is what is gained or lost from one spectrum to another, at the lines of the one whose lines are further apart,
// as far as both reach; the other is read between its lines as At does. Amplitudes below 1 fV count as 1 fV.
//
// The sampling rates may differ. Window and duration may not (to within 1 %, by the bandwidth): the line of a ring that dies
// out depends on both, and that is an error.
func Difference(before, after Spectrum) (Change, error) {
	if err := checkSame(before, after); err != nil {
		return Change{}, err
	}
	c := Change{StepHz: max(before.StepHz, after.StepHz)}
	top := min(before.StepHz*float64(len(before.Volts)-1), after.StepHz*float64(len(after.Volts)-1))
	for k := range int(top/c.StepHz*(1+1e-12)) + 1 {
		db, err := DifferenceAt(before, after, float64(k)*c.StepHz)
		if err != nil {
			return Change{}, err
		}
		c.DB = append(c.DB, db)
	}
	return c, nil
}

// DifferenceAt is Difference at one frequency, in dB.
func DifferenceAt(before, after Spectrum, hz float64) (float64, error) {
	if err := checkSame(before, after); err != nil {
		return 0, err
	}
	a, err := before.At(hz)
	if err != nil {
		return 0, fmt.Errorf("the difference of two spectra, the first: %w", err)
	}
	b, err := after.At(hz)
	if err != nil {
		return 0, fmt.Errorf("the difference of two spectra, the second: %w", err)
	}
	return DBuV(b) - DBuV(a), nil
}

func checkSame(a, b Spectrum) error {
	if a.Window != b.Window {
		return fmt.Errorf("the difference of two spectra with windows %v and %v: use one window for both", a.Window, b.Window)
	}
	if !(math.Abs(a.BandwidthHz-b.BandwidthHz) <= 0.01*a.BandwidthHz) || !(a.StepHz > 0 && b.StepHz > 0) {
		return fmt.Errorf("the difference of two spectra with bandwidths of %.4g Hz and %.4g Hz: cut both records to one duration", a.BandwidthHz, b.BandwidthHz)
	}
	return nil
}
