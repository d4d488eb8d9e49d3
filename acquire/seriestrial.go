package acquire

import (
	"context"
	"errors"
	"io"

	"ringbook/snubber"
)

// swap has what is proposed fitted, or what a person fits instead, and reads it.
func (s *Series) swap(ctx context.Context, p proposal) error {
	if err := s.safe(ctx); err != nil {
		return err
	}
	if !s.Unattended {
		fitted, err := s.fits(ctx, p)
		if fitted == nil || err != nil {
			return err
		}
		p = *fitted
	}
	if err := s.switchIn(ctx, p); err != nil {
		return err
	}
	s.fitted = &p
	return s.read(ctx, p, "")
}

// fits asks a person to fit what is proposed and gives what they fitted; nil when it is to be skipped.
func (s *Series) fits(ctx context.Context, p proposal) (*proposal, error) {
	q := Question{Kind: FitPart, Text: s.fitText(p), Why: p.why, Choices: "Enter when it is fitted; or a value (330p), bare, skip, again, done"}
	if p.part.Switched() || s.Bench.CanFit() {
		q.Choices = "Enter to go on; or a value (330p), bare, skip, again, done"
	}
	for {
		a, err := s.ask(ctx, q, true, "bare", "skip", "again", "done")
		switch {
		case err != nil:
			return nil, err
		case a.part != nil:
			return &proposal{network: a.part.Network(), part: *a.part}, nil
		case a.word == "bare":
			return &proposal{network: snubber.Network{Kind: snubber.Bare}}, nil
		case a.word == "skip" && p.network.Kind == snubber.Bare:
			s.skipped["bare"] = true
			return nil, nil
		case a.word == "skip":
			s.skipped[p.part.key()] = true
			return nil, nil
		case a.word == "done":
			return nil, errDone
		case a.word == "again" && s.fitted == nil:
			q.Again = "nothing was fitted yet in this run that could be read again"
		case a.word == "again":
			return s.fitted, nil
		default:
			return &p, nil
		}
	}
}

// fitText is what a person is to do.
func (s *Series) fitText(p proposal) string {
	what := describePart(p.network, p.part.Name)
	switch {
	case p.part.Switched():
		return "The rig switches " + what + " in: keep clear."
	case s.Bench.CanFit():
		return "The rig fits " + what + ": keep clear."
	case p.network.Kind == snubber.Bare:
		return "Leave the node bare now: nothing across the switch."
	}
	return "Fit " + what + " now."
}

// switchIn has the rig put a network in, as far as it can. The supply is off and the bus discharged.
func (s *Series) switchIn(ctx context.Context, p proposal) error {
	if s.in != nil && s.in.key() != p.part.key() {
		if err := s.Bench.SwitchPart(ctx, *s.in, false); err != nil {
			return err
		}
		s.in = nil
	}
	if s.Bench.CanFit() {
		n := p.network
		if p.part.Switched() {
			n = snubber.Network{Kind: snubber.Bare}
		}
		if err := s.Bench.Fit(ctx, n); err != nil {
			return err
		}
	}
	if !p.part.Switched() {
		return nil
	}
	s.in = &p.part // from here on it may be in
	return s.Bench.SwitchPart(ctx, p.part, true)
}

// read reads what is fitted, logs it, and has a person look at it again where the other trials contradict it. instead is the
// trial that it takes the place of; "" for none.
func (s *Series) read(ctx context.Context, p proposal, instead string) error {
	t, err := s.log(ctx, p)
	if err != nil {
		return err
	}
	if instead != "" {
		if err := s.strike(ctx, instead, "read again at once, as trial "+t.ID); err != nil {
			return err
		}
	}
	before := s.fit
	if err := s.refit(ctx); err != nil {
		return err
	}
	s.logged(t)
	why := doubt(before, s.fit, t)
	if other := s.onlyOther(t); why != "" && other != "" {
		why += ", unless " + other + " is what is not as it says"
	}
	switch {
	case why == "":
	case s.Unattended:
		s.tell(Remark{"It disagrees with the others: " + why + "."})
	default:
		return s.inDoubt(ctx, p, t, why)
	}
	return nil
}

// log switches on, reads, switches off and logs.
func (s *Series) log(ctx context.Context, p proposal) (snubber.Trial, error) {
	t := s.Trial
	t.Network, t.Part = p.network, p.part.Name
	for tries := 1; ; tries++ {
		taken, err := s.take(ctx, t)
		if err == nil {
			if taken.ID, err = s.Log(ctx, taken, s.records); err == nil {
				s.keep(taken)
			}
			return taken, err
		}
		if again := s.again(ctx, err, tries); again != nil {
			return t, again
		}
	}
}

// again says whether a trial that failed is begun again, by nil; otherwise why not.
func (s *Series) again(ctx context.Context, err error, tries int) error {
	var fault *Fault
	if ctx.Err() != nil || !errors.As(err, &fault) {
		return err
	}
	if off := s.off(ctx); off != nil {
		return errors.Join(err, off)
	}
	if s.Unattended {
		if tries > 1 {
			return err
		}
		s.tell(Remark{"The trial is begun again: " + err.Error() + "."})
		return nil
	}
	q := Question{Kind: Trouble, Text: "Nothing was logged: " + err.Error() + ".", Choices: "Enter tries again; done ends the series"}
	a, asked := s.ask(ctx, q, false, "done")
	if errors.Is(asked, io.EOF) || asked == nil && a.word == "done" {
		return err
	}
	return asked
}

// take switches on, reads and switches off.
func (s *Series) take(ctx context.Context, t snubber.Trial) (snubber.Trial, error) {
	if err := s.power(ctx); err != nil {
		return t, err
	}
	s.tell(Taking{t.Network})
	taken, records, warnings, err := s.Take(ctx, t)
	if err != nil {
		return t, err
	}
	s.records, s.warnings = records, warnings
	return taken, s.off(ctx)
}

func (s *Series) keep(t snubber.Trial) {
	s.trials = append(s.trials, t)
	s.result.Trials = append(s.result.Trials, t)
}

// logged tells of a trial.
func (s *Series) logged(t snubber.Trial) {
	left := -1
	if s.Drawer != nil {
		left = len(s.left())
	}
	s.tell(Logged{Trial: t, Warnings: s.warnings, Fit: s.fit, FitErr: s.fitErr, Read: s.count(func(snubber.Trial) bool { return true }), Left: left})
}
