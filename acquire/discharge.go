package acquire

import (
	"context"
	"errors"
	"fmt"
	"math"
	"time"

	"ringbook/acquire/scpi"
	"ringbook/snubber"
)

// ErrStillCharged says that the bus was not safe to touch in time.
var ErrStillCharged = errors.New("the bus is still charged")

// ErrNotProvided says that no instrument of the rig gives a reading that is needed.
var ErrNotProvided = errors.New("no instrument of the rig provides it")

// notProvided names the reading.
func notProvided(q snubber.Quantity) error {
	return fmt.Errorf("read %s: %w: give the instrument that can a table [instrument.NAME.reading.%s] with its query", q, ErrNotProvided, q)
}

// Require gives an error, ErrNotProvided with its cure, for the first of these readings that no instrument of the rig
// provides.
func (r Rig) Require(quantities ...snubber.Quantity) error {
	provided := map[snubber.Quantity]bool{}
	for _, in := range r.Instruments {
		for _, q := range in.Readings {
			provided[q.Quantity] = true
		}
	}
	for _, q := range quantities {
		if !provided[q] {
			return notProvided(q)
		}
	}
	return nil
}

// Read reads one quantity once, in its unit. Where the rig does not provide it the error is ErrNotProvided; where the
// instrument has no reading, a *Fault with scpi.ErrNoReading. With any error the value is NaN.
func (s *Station) Read(ctx context.Context, q snubber.Quantity) (float64, error) {
	in, query := s.provider(q)
	if in == nil {
		return math.NaN(), notProvided(q)
	}
	v := math.NaN()
	err := s.again(ctx, func() error {
		err := in.ready(ctx)
		if err == nil {
			v, _, err = in.once(ctx, query)
		}
		if err != nil {
			return in.fault("read "+string(q), err)
		}
		return nil
	})
	return v, err
}

// lookAgain is how long Discharged waits between two readings.
const lookAgain = 100 * time.Millisecond

// Discharged reads bus_v until it is safe: twice in a row, the reading's size and the bound of its accuracy together are
// below limitV, in volts. No reading is not safe. progress is called with each reading, NaN for none; nil is allowed.
//
// When that does not come about within the time given, the error is ErrStillCharged and says the voltage last read.
// A rig without bus_v gives ErrNotProvided, an instrument that fails a *Fault: in neither case may anyone touch the
// board for what Discharged knows.
func (s *Station) Discharged(ctx context.Context, limitV float64, within time.Duration, progress func(v float64)) error {
	if !(limitV > 0) || math.IsInf(limitV, 0) {
		return fmt.Errorf("wait for the bus to discharge: limit %g V: it must be a voltage above zero", limitV)
	}
	_, q := s.provider(snubber.BusV)
	safe := 0
	for end := time.Now().Add(within); ; {
		v, err := s.Read(ctx, snubber.BusV)
		if err != nil && !errors.Is(err, scpi.ErrNoReading) {
			return fmt.Errorf("wait for the bus to discharge: %w", err)
		}
		if progress != nil {
			progress(v)
		}
		if math.Abs(v)+q.Accuracy.Bound(v) < limitV { // which NaN is not
			safe++
		} else {
			safe = 0
		}
		switch {
		case safe == 2:
			return nil
		case safe == 1: // the second decides, however late it is
		case !time.Now().Before(end) && math.IsNaN(v):
			return fmt.Errorf("%w for all that is known: no reading of bus_v %s after the supply was switched off, and %.3g V is the limit: do not touch the board; discharge it by hand, and check the meter", ErrStillCharged, within, limitV)
		case !time.Now().Before(end):
			return fmt.Errorf("%w: %.3g V after %s, and %.3g V is the limit: do not touch the board; check that the supply is off, and discharge it through a resistor", ErrStillCharged, v, within, limitV)
		}
		if err := pause(ctx, lookAgain); err != nil {
			return fmt.Errorf("wait for the bus to discharge: %w", err)
		}
	}
}
