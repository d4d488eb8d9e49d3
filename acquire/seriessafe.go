package acquire

import (
	"context"
	"errors"
	"fmt"
	"time"
)

// offWithin is how long the last switching-off may take, whatever ended the series.
const offWithin = 45 * time.Second

// safe sees that the supply is off and the bus below the safe limit, by the instruments where they can and by a person where
// they cannot.
func (s *Series) safe(ctx context.Context) error {
	if s.Bench.CanSwitch() {
		if err := s.off(ctx); err != nil {
			return err
		}
		if !s.readsBus() {
			return s.byHand(ctx, "The supply is off. Nothing reads the bus: see with a meter that it is below "+volts(s.SafeV)+".")
		}
		return s.discharged(ctx)
	}
	for text := "Switch the supply off."; s.on; {
		if !s.readsBus() {
			text += " Nothing reads the bus: see with a meter that it is below " + volts(s.SafeV) + "."
		}
		if err := s.byHand(ctx, text); err != nil {
			return err
		}
		s.on = false
		if !s.readsBus() {
			return nil
		}
		err := s.discharged(ctx)
		if !errors.Is(err, ErrStillCharged) {
			return err
		}
		s.on, text = true, "Switch the supply off: "+err.Error()+"."
	}
	if s.readsBus() {
		return s.discharged(ctx)
	}
	return nil
}

// byHand asks a person to see to it that the bench is safe.
func (s *Series) byHand(ctx context.Context, text string) error {
	return s.confirm(ctx, Question{Kind: MakeSafe, Text: text, Choices: "Enter when it is so; done"})
}

func (s *Series) discharged(ctx context.Context) error {
	err := s.Bench.Discharged(ctx, s.SafeV, s.Within, func(v float64) { s.tell(Discharging{v}) })
	if err == nil {
		s.tell(Safe{s.SafeV})
	}
	return err
}

// off switches the supply off where the rig can.
func (s *Series) off(ctx context.Context) error {
	if !s.Bench.CanSwitch() {
		return nil
	}
	if err := s.Bench.Switch(ctx, false); err != nil {
		return err
	}
	if s.on {
		s.tell(Output{On: false})
	}
	s.on = false
	return nil
}

// power switches the supply on, or has a person do it.
func (s *Series) power(ctx context.Context) error {
	s.on = true // from here on it may be
	if !s.Bench.CanSwitch() {
		return s.confirm(ctx, Question{Kind: SwitchOn, Text: "Keep clear and switch the supply on.", Choices: "Enter when it runs; done"})
	}
	if err := s.Bench.Switch(ctx, true); err != nil {
		return err
	}
	s.tell(Output{On: true})
	return nil
}

// leave switches the supply off, whatever happened and even if ctx is over. err is what ended the series.
func (s *Series) leave(ctx context.Context, err error) error {
	if !s.Bench.CanSwitch() {
		if s.on {
			s.tell(Remark{"The supply may be on: switch it off before you touch the board."})
		}
		return err
	}
	ctx, cancel := context.WithTimeout(context.WithoutCancel(ctx), offWithin)
	defer cancel()
	off := s.Bench.Switch(ctx, false)
	if off != nil {
		off = fmt.Errorf("THE SUPPLY MAY BE ON, switch it off by hand: %w", off)
		if err != nil {
			return fmt.Errorf("%w; before that: %w", off, err)
		}
		return off
	}
	s.on = false
	s.tell(Output{On: false})
	return err
}

func volts(v float64) string { return fmt.Sprintf("%.3g V", v) }
