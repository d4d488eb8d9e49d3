package main

import (
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"strings"

	"ringbook/recipes"
)

// pages weaves every recipe from the demonstration's logbook, into HTML files beside it, and gives their names. One that has
// nothing to show is left out.
func (d *demo) pages(ctx context.Context, src recipes.Source) ([]string, error) {
	stem := strings.TrimSuffix(d.lb.Path(), filepath.Ext(d.lb.Path()))
	var names []string
	for _, r := range recipes.All() {
		of := src
		if !r.Single {
			of.Scope.Revision = "" // the board's history, and its revisions side by side
		}
		woven, err := r.Page(ctx, of)
		if err != nil && (errors.Is(err, context.Canceled) || woven == nil || !woven.Empty) {
			return names, fmt.Errorf("weave page %s: %w", r.Name, err)
		}
		if err != nil {
			continue
		}
		name := stem + "-" + r.Name + ".html"
		file, err := recipes.NewFile(name, true)
		if err != nil {
			return names, err
		}
		if _, err := file.Write(woven.Page); err != nil {
			return names, err
		}
		names = append(names, name)
	}
	return names, nil
}
