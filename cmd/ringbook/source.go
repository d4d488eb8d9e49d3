package main

import (
	"context"
	"errors"

	"ringbook/recipes"
)

// source opens the logbook and narrows the scope to one board revision. The caller closes the logbook.
func (a *app) source(ctx context.Context, flags *scopeFlags) (recipes.Source, error) {
	scope, err := flags.read()
	if err != nil {
		return recipes.Source{}, err
	}
	lb, err := a.read(ctx)
	if err != nil {
		return recipes.Source{}, err
	}
	scope, err = recipes.OneRevision(ctx, lb, scope)
	if err != nil {
		return recipes.Source{}, errors.Join(severalIsUsage(err), lb.Close())
	}
	return recipes.Source{Logbook: lb, Scope: scope}, nil
}
