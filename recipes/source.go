package recipes

import (
	"context"

	"ringbook/snubber"
	"ringbook/store"
)

// Source is what a recipe is woven from.
type Source struct {
	Logbook *store.Logbook
	Scope   store.Scope
	Limits  Request
}

// Trials are all the trials in scope, in the order they were read.
func (s Source) Trials(ctx context.Context) ([]snubber.Trial, error) {
	var all []snubber.Trial
	for t, err := range s.Logbook.Trials(ctx, s.Scope) {
		if err != nil {
			return nil, err
		}
		all = append(all, t)
	}
	return all, nil
}
