// Package waveform reads a captured edge: from evenly spaced samples of a voltage to the ring's frequency and decay, the
// peak, the level it settles at, and its spectrum, with standard uncertainties.
//
// It knows nothing of loops or networks and talks to no instrument.
package waveform

import (
	"fmt"
	"math"
)

// Record is a voltage sampled at even intervals, as an instrument or a file gave it.
type Record struct {
	Start    float64   // s: time of the first sample
	Interval float64   // s, > 0: from one sample to the next
	Volts    []float64 // V, every one finite
	StepV    float64   // V: the converter's step where it is known; 0: not known
	Origin   string    // the file or the instrument it is from; "" when not said
}

// TimeAt is the time of sample i, s.
func (r Record) TimeAt(i int) float64 { return r.Start + float64(i)*r.Interval }

// Check says what keeps the record from being read: no samples, an interval that is not positive, a number that is not
// finite. It names the sample.
func (r Record) Check() error {
	switch {
	case len(r.Volts) == 0:
		return fmt.Errorf("the record is empty: it has no samples")
	case !(r.Interval > 0) || math.IsInf(r.Interval, 0):
		return fmt.Errorf("the record's interval of %g s: it must be positive and finite", r.Interval)
	case math.IsNaN(r.Start) || math.IsInf(r.Start, 0):
		return fmt.Errorf("the record's start of %g s: it must be finite", r.Start)
	case !(r.StepV >= 0) || math.IsInf(r.StepV, 0):
		return fmt.Errorf("the record's step of %g V: it must be zero or positive, and finite", r.StepV)
	}
	for i, v := range r.Volts {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return fmt.Errorf("sample %d of the record, at %g s, is %g V: take the record again, or cut it there", i+1, r.TimeAt(i), v)
		}
	}
	return nil
}
