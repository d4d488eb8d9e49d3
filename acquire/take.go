package acquire

import (
	"context"
	"fmt"
	"math"

	"ringbook/acquire/scpi"
	"ringbook/snubber"
)

// Result is what one round of readings gave.
type Result struct {
	Readings []snubber.Reading // in the order of snubber.Quantities; one that gave nothing is absent
	Warnings []string          // what is absent or doubtful, why, and the cure
}

// Progress is one repeat, just read.
type Progress struct {
	Quantity   snubber.Quantity
	Instrument string  // the rig's name for it
	Repeat     int     // from 1
	Repeats    int     // how many there will be; one more where one of them lies off
	Value      float64 // in the quantity's unit; NaN when there was no reading
}

// Take reads every quantity the rig provides, each as often as its repeats say. progress is called after
// each repeat; nil is allowed.
//
// A quantity with no reading (9.91E37) in more than half of its repeats is absent, with a warning; with
// none in fewer, it is the mean of the rest, with a warning. A repeat that lies further off than the others' spread
// allows is asked once more; both are kept, with a warning.
//
// An instrument that refuses ends the round with a *Fault, and so does one that is silent or talks nonsense twice. The
// next round clears its link first. After a lost link was opened again, and after the first silence or nonsense, the
// round is begun again from its start, which is a warning; progress then counts anew.
func (s *Station) Take(ctx context.Context, progress func(Progress)) (Result, error) {
	var result Result
	err := s.again(ctx, func() (err error) {
		result, err = s.round(ctx, progress)
		return err
	})
	if err != nil {
		return Result{}, err
	}
	result.Warnings = append(s.notices, result.Warnings...)
	s.notices = nil
	return result, nil
}

// round reads every quantity.
func (s *Station) round(ctx context.Context, progress func(Progress)) (Result, error) {
	var result Result
	for _, quantity := range snubber.Quantities() {
		in, q := s.provider(quantity)
		if in == nil {
			continue
		}
		r, err := in.repeat(ctx, q, progress)
		if err != nil {
			return Result{}, in.fault("read "+string(quantity), err)
		}
		reading, warning := in.reading(q, r)
		if reading != nil {
			result.Readings = append(result.Readings, *reading)
		}
		for _, w := range []string{warning, r.warning(q, in.Name)} {
			if w != "" {
				result.Warnings = append(result.Warnings, w)
			}
		}
	}
	return result, nil
}

// once asks once, and gives the reply as it came too. Without a reading it gives NaN and ErrNoReading.
func (in *instrument) once(ctx context.Context, q Query) (v float64, raw string, err error) {
	header, args, err := scpi.ParseUnit(q.Query)
	if err != nil {
		return math.NaN(), "", err
	}
	err = in.conn.QueryFunc(ctx, func(reply string) (err error) {
		raw = reply
		v, err = scpi.ParseNumber(reply)
		return err
	}, header, args...)
	if err != nil {
		return math.NaN(), raw, err
	}
	v *= q.scale()
	if why := impossible(q.Quantity, v); why != "" {
		return math.NaN(), raw, fmt.Errorf("reply %q to %q is %s = %g: %s", raw, q.Query, q.Quantity, v, why)
	}
	return v, raw, nil
}

// impossible says why a quantity cannot have this value; "" when it can.
func impossible(q snubber.Quantity, v float64) string {
	switch {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return "it is beyond all numbers: check the scale in the rig file"
	case (q == snubber.RingHz || q == snubber.SwitchingHz) && v <= 0:
		return "a frequency is above zero: check the trigger, and that the board runs"
	case q == snubber.DecayS && v <= 0:
		return "a decay time is above zero: check the trigger and the cursors"
	case q == snubber.TempC && v < -273.15:
		return "it is below absolute zero: check the sensor and the scale in the rig file"
	}
	return ""
}

// reading makes a reading of what the repeats gave, or says why not.
func (in *instrument) reading(q Query, r repeated) (*snubber.Reading, string) {
	values, none, n := r.values, r.asked-len(r.values), r.asked
	if len(values) == 0 || 2*len(values) < n {
		return nil, fmt.Sprintf("%s is left out: %s gave no reading in %d of %d repeats; check its trigger, its range and the signal", q.Quantity, in.Name, none, n)
	}
	mean, u := q.evaluate(values)
	warning := ""
	switch {
	case none > 0:
		warning = fmt.Sprintf("%s: %s gave no reading in %d of %d repeats; the value is the mean of the other %d", q.Quantity, in.Name, none, n, len(values))
	case u == 0:
		warning = fmt.Sprintf("%s: its uncertainty is not known, since the repeats do not differ and no accuracy is stated; state the accuracy of %s in the rig file", q.Quantity, in.Name)
	}
	return &snubber.Reading{Quantity: q.Quantity, Value: mean, U: u, Repeats: values, Instrument: in.identity}, warning
}

func (q Query) repeats() int {
	if q.Repeats == 0 {
		return DefaultRepeats
	}
	return q.Repeats
}

func (q Query) scale() float64 {
	if q.Scale == 0 {
		return 1
	}
	return q.Scale
}
