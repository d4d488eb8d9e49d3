package acquire

import (
	"context"
	"fmt"
	"slices"

	"ringbook/snubber"
)

// inDoubt asks whether a trial that disagrees with the others is what it says, while the part is still in the person's hand.
func (s *Series) inDoubt(ctx context.Context, p proposal, t snubber.Trial, why string) error {
	if err := s.safe(ctx); err != nil {
		return err
	}
	q := Question{Kind: InDoubt, Text: "Is it really " + describePart(t.Network, t.Part) + "?", Why: why,
		Choices: "Enter if it is; or its value, bare, again (read again), wrong (strike), done"}
	a, err := s.ask(ctx, q, true, "bare", "keep", "again", "wrong", "done")
	switch {
	case err != nil:
		return err
	case a.part != nil:
		return s.correct(ctx, t, proposal{network: a.part.Network(), part: *a.part})
	case a.word == "bare":
		return s.correct(ctx, t, proposal{network: snubber.Network{Kind: snubber.Bare}})
	case a.word == "wrong":
		return s.strike(ctx, t.ID, "marked as wrong at the bench: "+why)
	case a.word == "again":
		return s.read(ctx, p, t.ID)
	case a.word == "done":
		return errDone
	}
	return nil
}

// correct logs a trial anew with what really was fitted. The old one is struck first, so that the two never both stand.
func (s *Series) correct(ctx context.Context, t snubber.Trial, p proposal) error {
	anew := t
	anew.ID, anew.Network, anew.Part = "", p.network, p.part.Name
	if anew.Network == t.Network && anew.Part == t.Part {
		return nil
	}
	because := fmt.Sprintf("corrected at the bench: %s was fitted, not %s", describePart(anew.Network, anew.Part), describePart(t.Network, t.Part))
	if err := s.strike(ctx, t.ID, because); err != nil {
		return err
	}
	id, err := s.Log(ctx, anew, s.records)
	if err != nil {
		return err
	}
	anew.ID = id
	s.keep(anew)
	s.fitted = &p
	before := s.fit
	if err := s.refit(ctx); err != nil {
		return err
	}
	s.logged(anew)
	if why := doubt(before, s.fit, anew); why != "" {
		s.tell(Remark{"It disagrees with the others still: " + why + "."})
	}
	return nil
}

// strike marks a trial of this run as wrong.
func (s *Series) strike(ctx context.Context, id, because string) error {
	if err := s.Strike(ctx, id, because); err != nil {
		return err
	}
	same := func(t snubber.Trial) bool { return t.ID == id }
	s.trials = slices.DeleteFunc(s.trials, same)
	if i := slices.IndexFunc(s.result.Trials, same); i >= 0 {
		s.result.Trials[i].Struck = because
	}
	s.tell(Struck{id, because})
	return nil
}
