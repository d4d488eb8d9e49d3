package acquire

import (
	"context"
	"errors"
	"fmt"
	"io"
	"time"

	"ringbook/snubber"
	"ringbook/snubber/waveform"
)

// Bench is what a series needs of the instruments. A [Station] is one.
type Bench interface {
	Provides() []snubber.Quantity
	CanSwitch() bool
	Switch(ctx context.Context, on bool) error
	Discharged(ctx context.Context, limitV float64, within time.Duration, progress func(v float64)) error
	CanFit() bool
	Fit(ctx context.Context, n snubber.Network) error
	SwitchPart(ctx context.Context, p Part, in bool) error
}

// Series is a guided capacitor-substitution series: the node bare, then one capacitor after another across the switch, each
// chosen by what the fit of all trials so far would gain from it.
//
// It knows neither the terminal nor the logbook: a person is asked through Ask, a trial kept through Log. What it sees to is
// the order of things. Parts are fitted, by hand or by relay, with the supply off and the bus read back below SafeV alone.
// A trial is logged before the next question. Whatever ends the series, a panic too, the supply is switched off.
type Series struct {
	Bench      Bench
	Drawer     []Part                              // the capacitors on hand; nil: those of Usual
	Usual      func(fit *snubber.FitResult) []Part // capacitors to choose from without a drawer; fit is nil while there is none
	Tol        float64                             // of a capacitor whose value a person types; 0: not stated
	Trial      snubber.Trial                       // what every trial states: board, revision, session, probe, operating point
	Past       []snubber.Trial                     // of the board revision, as logged; those of the session are not asked for again
	All        bool                                // go on when the fit says that it is enough
	Unattended bool                                // ask nobody: the rig switches every part
	SafeV      float64                             // V, > 0: below it a person may touch the node
	Within     time.Duration                       // longest wait for that; > 0

	// Ask puts a question and gives what a person typed; io.EOF is the end of all answers.
	Ask func(context.Context, Question) (string, error)
	// Take reads a trial of what is fitted, with its captures and what is doubtful about it.
	Take func(context.Context, snubber.Trial) (snubber.Trial, []waveform.Record, []string, error)
	// Log keeps a trial and gives its id; when it returns, the trial is on the disk.
	Log func(context.Context, snubber.Trial, []waveform.Record) (id string, err error)
	// Strike marks a logged trial as wrong.
	Strike func(ctx context.Context, id, because string) error
	// Tell is told what happens, for a person to see.
	Tell func(Event)

	trials   []snubber.Trial // that stand
	fit      *snubber.FitResult
	fitErr   error
	skipped  map[string]bool   // by key
	in       *Part             // what a relay holds across the switch
	fitted   *proposal         // what was fitted last
	on       bool              // the supply may be on
	records  []waveform.Record // of the trial read last
	warnings []string          // the same
	result   SeriesResult
}

// SeriesResult is what a series came to. It stands also beside an error.
type SeriesResult struct {
	Trials  []snubber.Trial    // logged by this run, in their order; one that was struck again says so
	Fit     *snubber.FitResult // of all trials of the board revision that stand; nil: they tell nothing yet
	FitErr  error              // why Fit is nil
	Ended   string             // why the series ended, in words
	Enough  bool               // because another capacitor would tell too little
	Resumed int                // trials of the session that were there already
}

// Event is something that happened.
type Event interface{ event() }

// The events of a series.
type (
	// Discharging is the bus voltage while it falls, V; NaN is no reading.
	Discharging struct{ Volts float64 }
	// Safe is a bus read below its limit, V, with the supply off.
	Safe struct{ LimitV float64 }
	// Output is the supply, switched.
	Output struct{ On bool }
	// Taking is a trial that is about to be read.
	Taking struct{ Network snubber.Network }
	// Logged is a trial that is on the disk, with what all trials now say.
	Logged struct {
		Trial    snubber.Trial
		Warnings []string
		Fit      *snubber.FitResult
		FitErr   error
		Read     int // trials of the session so far
		Left     int // parts of the drawer still to be read; -1: there is no drawer
	}
	// Struck is a trial marked as wrong.
	Struck struct{ ID, Because string }
	// Remark is anything else worth saying.
	Remark struct{ Text string }
)

func (Discharging) event() {}
func (Safe) event()        {}
func (Output) event()      {}
func (Taking) event()      {}
func (Logged) event()      {}
func (Struck) event()      {}
func (Remark) event()      {}

// errDone ends a series by a person's wish.
var errDone = errors.New("done")

// Run runs the series to its end. A series ends when another capacitor would tell too little, when all were read, or when a
// person says so; an error ends it too. Either way what was logged stands, and Run begun again with it as Past goes on.
func (s *Series) Run(ctx context.Context) (result SeriesResult, err error) {
	if err := s.check(); err != nil {
		return SeriesResult{}, err
	}
	s.skipped = map[string]bool{}
	for _, t := range s.Past {
		if t.Struck == "" {
			s.trials = append(s.trials, t)
			if t.Session == s.Trial.Session {
				s.result.Resumed++
			}
		}
	}
	s.on = true // or may be: nobody has looked
	defer func() { err = s.leave(ctx, err) }()
	if err := s.prepare(ctx); err != nil {
		return s.outcome(), err
	}
	for {
		if err := s.refit(ctx); err != nil {
			return s.outcome(), err
		}
		p, ended := s.next()
		err := errDone
		if p == nil {
			s.result.Ended = ended
		} else if err = s.swap(ctx, *p); errors.Is(err, errDone) || errors.Is(err, io.EOF) {
			s.result.Ended = "as asked"
		} else if err == nil {
			continue
		}
		if s.result.Ended != "" {
			err = s.clear(ctx)
		}
		return s.outcome(), err
	}
}

func (s *Series) outcome() SeriesResult {
	s.result.Fit, s.result.FitErr = s.fit, s.fitErr
	return s.result
}

// check reports what a series cannot begin with.
func (s *Series) check() error {
	reads := s.readsBus()
	switch {
	case !(s.SafeV > 0):
		return fmt.Errorf("series: a safe voltage of %g V: it must be positive", s.SafeV)
	case s.Within <= 0:
		return fmt.Errorf("series: %s for the bus to discharge: it must be longer than nothing", s.Within)
	case s.Unattended && !s.Bench.CanSwitch():
		return errors.New("series: nobody is there to switch the supply off, and no instrument of the rig can: give the supply's on and off in the rig file, or stay with it")
	case s.Unattended && !reads:
		return errors.New("series: nobody is there to see that the bus is discharged, and no instrument of the rig reads bus_v: give one in the rig file, or stay with it")
	}
	if s.Unattended && !s.Bench.CanFit() {
		if len(s.Drawer) == 0 {
			return errors.New("series: nobody is there to fit capacitors, and the rig cannot: give a drawer whose capacitors are switched by command, or stay with it")
		}
		for _, p := range s.Drawer {
			if !p.Switched() {
				return fmt.Errorf("series: nobody is there to fit %s, and no command of the drawer switches it: give it instrument, switch and unswitch, or take it out", p.Name)
			}
		}
	}
	return nil
}

func (s *Series) readsBus() bool {
	for _, q := range s.Bench.Provides() {
		if q == snubber.BusV {
			return true
		}
	}
	return false
}

// prepare makes the bench safe and takes every relay out.
func (s *Series) prepare(ctx context.Context) error {
	var switched []Part
	for _, p := range s.Drawer {
		if p.Switched() {
			switched = append(switched, p)
		}
	}
	if len(switched) == 0 {
		return nil
	}
	if err := s.safe(ctx); err != nil {
		return err
	}
	for _, p := range switched {
		if err := s.Bench.SwitchPart(ctx, p, false); err != nil {
			return err
		}
	}
	return nil
}

// clear leaves the node as it was found: without what a relay put across it.
func (s *Series) clear(ctx context.Context) error {
	if s.in == nil {
		return nil
	}
	if err := s.safe(ctx); err != nil {
		return err
	}
	return s.Bench.SwitchPart(ctx, *s.in, false)
}

// refit fits all trials that stand. Only ctx ends a series here: what the trials cannot tell yet, more will.
func (s *Series) refit(ctx context.Context) error {
	s.fit, s.fitErr = snubber.Fit(ctx, s.trials)
	return ctx.Err()
}

func (s *Series) tell(e Event) {
	if s.Tell != nil {
		s.Tell(e)
	}
}
