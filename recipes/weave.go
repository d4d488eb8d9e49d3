package recipes

import (
	"bytes"
	"context"
	"fmt"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/store"
)

// madeBy stands at the foot of each page. It is no stamp of a build, so that the same version gives the same page.
const madeBy = "ringbook 0.6"

// Woven is the page that a recipe gave.
type Woven struct {
	*page.Page
	Digest string // store.TrialsDigest of the trials it read through its Source; "" where it read none
	Empty  bool   // it failed before it put a table, figures or a plot on the page
}

// Page weaves the recipe's page, with its foot. An error or a panic of the recipe is given back with the page, where it
// stands at its place. Without a page come: the errors of RevisionsInScope, and of OneRevision for a recipe of a single one; and
// the end of ctx.
func (r Recipe) Page(ctx context.Context, src Source) (*Woven, error) {
	src.Scope.IncludeStruck = src.Scope.IncludeStruck || r.Struck
	var err error
	if r.Single {
		src.Scope, err = OneRevision(ctx, src.Logbook, src.Scope)
	} else {
		_, err = RevisionsInScope(ctx, src.Logbook, src.Scope)
	}
	if err != nil {
		return nil, err
	}
	src.used = new(used)
	w := &Woven{Page: r.blank(src.Scope)}
	failed := w.Run(func() error { return r.Weave(ctx, w.Page, src) })
	if ctx.Err() != nil {
		return nil, ctx.Err()
	}
	if failed != nil {
		var results bytes.Buffer // there is no foot yet
		if err := w.CSV(&results); err != nil {
			return nil, fmt.Errorf("%w; and %w", failed, err)
		}
		w.Empty = results.Len() == 0
	}
	w.Digest = src.used.sum()
	w.Foot(page.Foot{Scope: inWords(src.Scope), Digest: w.Digest, Version: madeBy})
	return w, failed
}

// Failed is the recipe's page where it could not be begun: its title and the error.
func (r Recipe) Failed(s store.Scope, err error) *page.Page {
	p := r.blank(s)
	_ = p.Run(func() error { return err }) // it gives err back
	return p
}

func (r Recipe) blank(s store.Scope) *page.Page {
	title := r.Title
	if s.Board != "" {
		title += " of " + s.Board
		if s.Revision != "" {
			title += " " + s.Revision
		}
	}
	return page.New(title)
}

// used gathers what a recipe reads for the digest, each trial once.
type used struct {
	digest store.Digester
	seen   map[string]bool
}

func (u *used) add(t *snubber.Trial) {
	if u == nil || u.seen[t.ID] {
		return
	}
	if u.seen == nil {
		u.seen = map[string]bool{}
	}
	u.seen[t.ID] = true
	u.digest.Add(t)
}

func (u *used) sum() string {
	if len(u.seen) == 0 {
		return ""
	}
	return u.digest.Sum()
}
