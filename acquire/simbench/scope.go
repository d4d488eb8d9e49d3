package simbench

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
)

// Scope is the oscilloscope: eight bits, noise, no bandwidth limit of its own.
type Scope struct {
	RateHz  float64 // samples per second, > 0
	Points  int     // samples in a capture, 64 to 100 000
	Before  int     // of which before the trigger, in [16, Points/2]
	NoiseV  float64 // V rms, >= 0: white noise ahead of the converter
	SpanV   float64 // V, > 0: from the lowest code to the highest
	BottomV float64 // V: the lowest code
}

func (s Scope) check() error {
	switch {
	case !positive(s.RateHz):
		return fmt.Errorf("scope at %g samples/s: the rate must be positive and finite", s.RateHz)
	case s.Points < 64 || s.Points > 100_000:
		return fmt.Errorf("scope with %d points: it must be 64 to 100000", s.Points)
	case s.Before < 16 || s.Before > s.Points/2:
		return fmt.Errorf("scope with %d points before the trigger: it must be 16 to half of all", s.Before)
	case !notNegative(s.NoiseV):
		return fmt.Errorf("scope noise %g V: it must be zero or positive, and finite", s.NoiseV)
	case !positive(s.SpanV), math.IsNaN(s.BottomV), math.IsInf(s.BottomV, 0):
		return fmt.Errorf("scope range of %g V from %g V: the span must be positive and both finite", s.SpanV, s.BottomV)
	}
	return nil
}

// after is how long a capture goes on after the trigger, s.
func (s Scope) after() float64 { return float64(s.Points-s.Before) / s.RateHz }

// Capture is one record as the scope's converter saw it.
type Capture struct {
	StartS      float64 // s: time of the first sample; 0 is the trigger
	StepS       float64 // s
	VoltsPerBit float64 // V
	BottomV     float64 // V: what code 0 stands for
	Codes       []uint8
}

// TimeAt is the time of sample i, s.
func (c Capture) TimeAt(i int) float64 { return c.StartS + float64(i)*c.StepS }

// Volts is the record in volts.
func (c Capture) Volts() []float64 {
	v := make([]float64, len(c.Codes))
	for i, code := range c.Codes {
		v[i] = c.BottomV + c.VoltsPerBit*float64(code)
	}
	return v
}

// Clipped says whether the signal left the converter's range.
func (c Capture) Clipped() bool {
	for _, code := range c.Codes {
		if code == 0 || code == math.MaxUint8 {
			return true
		}
	}
	return false
}

// capture samples the record r. The sampling clock runs free of the trigger, so where the edge falls
// between two samples is drawn anew each time.
func (s Scope) capture(r *record, rng *rand.Rand) Capture {
	volts := make([]float64, s.Points)
	start, step := -float64(s.Before)/s.RateHz, 1/s.RateHz
	r.sample(start+rng.Float64()*step, step, volts)
	return s.digitize(volts, rng)
}

// still is a capture of a node that stands at a voltage: what a scope that triggers by itself shows without an edge.
func (s Scope) still(volt float64, rng *rand.Rand) Capture {
	return s.digitize(slices.Repeat([]float64{volt}, s.Points), rng)
}

// digitize is what the converter makes of the voltages at its samples.
func (s Scope) digitize(volts []float64, rng *rand.Rand) Capture {
	c := Capture{StartS: -float64(s.Before) / s.RateHz, StepS: 1 / s.RateHz,
		VoltsPerBit: s.SpanV / math.MaxUint8, BottomV: s.BottomV, Codes: make([]uint8, s.Points)}
	for i, v := range volts {
		code := math.Round((v + s.NoiseV*rng.NormFloat64() - c.BottomV) / c.VoltsPerBit)
		c.Codes[i] = uint8(min(max(code, 0), math.MaxUint8))
	}
	return c
}
