package recipes

import (
	"context"
	"iter"

	"ringbook/snubber"
	"ringbook/snubber/waveform"
	"ringbook/store"
)

// Source is what a recipe is woven from.
type Source struct {
	Logbook *store.Logbook
	Scope   store.Scope
	Limits  Request
	OnHand  []float64 // F: the capacitors on hand, for what to fit next; nil: the E6 series
	Compare []string  // the revisions to compare, the reference first; nil: all in scope
	Found   *Found    // what was searched for and found; nil: nothing was searched for

	used *used // what was read, for the digest at a page's foot; nil: nobody asks
}

// Found is what a search found: Each gives these in place of the trials in scope.
type Found struct {
	Order  string // how a title says theirs: "by peak, the lowest first"
	Trials iter.Seq2[snubber.Trial, error]
}

// Trials are all the trials in scope, in the order they were read. They count as used in the digest at the page's foot.
func (s Source) Trials(ctx context.Context) ([]snubber.Trial, error) {
	var all []snubber.Trial
	for t, err := range s.Each(ctx) {
		if err != nil {
			return nil, err
		}
		all = append(all, t)
	}
	return all, nil
}

// Each is Trials one at a time, for more of them than memory should hold.
func (s Source) Each(ctx context.Context) iter.Seq2[snubber.Trial, error] {
	return func(yield func(snubber.Trial, error) bool) {
		for t, err := range s.trials(ctx) {
			if err == nil {
				s.used.add(&t)
			}
			if !yield(t, err) {
				return
			}
		}
	}
}

func (s Source) trials(ctx context.Context) iter.Seq2[snubber.Trial, error] {
	if s.Found != nil {
		return s.Found.Trials
	}
	return s.Logbook.Trials(ctx, s.Scope)
}

// order says in words what order Each gives the trials in.
func (s Source) order() string {
	if s.Found != nil {
		return s.Found.Order
	}
	return "in the order they were read"
}

// Fit fits the trials, and says what to fit next of the capacitors on hand.
func (s Source) Fit(ctx context.Context, trials []snubber.Trial) (*snubber.FitResult, error) {
	fit, err := snubber.Fit(ctx, trials)
	if err != nil || s.OnHand == nil {
		return fit, err
	}
	var on []snubber.Candidate
	for _, c := range s.OnHand {
		on = append(on, snubber.Candidate{C: c, CTol: fit.UsualTolerance()})
	}
	fit.Suggestion = fit.Next(on)
	return fit, nil
}

// captures are the records logged with a trial.
func (s Source) captures(ctx context.Context, trial string) (records []waveform.Record, err error) {
	for w, err := range s.Logbook.Waveforms(ctx, trial) {
		if err != nil {
			return nil, err
		}
		records = append(records, w.Record)
	}
	return records, nil
}
