package main

import (
	"context"
	"errors"

	"ringbook/store"

	"github.com/spf13/cobra"
)

func logbookAudit(a *app) *cobra.Command {
	return &cobra.Command{
		Use:   "audit",
		Short: "Look whether anything in the logbook was changed, lost or damaged",
		Long: `audit reads the whole logbook: SQLite's own check of the file, and every trial, strike, decision and statement of a board
against its link (SHA-256) in the chain of entries. It names the first that is not what was logged; the exit code is then 3.

The last link, noted elsewhere, shows later that the logbook was not cut short or made anew. Others may log meanwhile.`,
		Example: `  ringbook logbook audit
  ringbook logbook audit --logbook /media/stick/ringbook-2026-03.db --json`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) error {
			path, r, err := a.audit(cmd.Context())
			if err != nil {
				return err
			}
			return a.audited("Logbook "+path, r, "Logbook "+path+" is sound")
		},
	}
}

// audit audits the logbook; one too damaged to be opened is an answer too.
func (a *app) audit(ctx context.Context) (path string, r store.Report, err error) {
	lb, err := a.read(ctx)
	var fault *store.Fault
	if errors.As(err, &fault) && fault.Kind == store.ErrDamaged {
		return fault.Path, store.Report{Damage: []store.Damage{{What: fault.What}}}, nil
	}
	if err != nil {
		return "", r, err
	}
	defer closing(lb, &err)
	r, err = lb.Audit(ctx, a.passing("audited"))
	return lb.Path(), r, err
}
