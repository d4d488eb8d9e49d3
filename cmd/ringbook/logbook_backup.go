package main

import (
	"ringbook/store"

	"github.com/spf13/cobra"
)

func logbookBackup(a *app) *cobra.Command {
	return &cobra.Command{
		Use:   "backup FILE",
		Short: "Copy the logbook, in use or not, and audit the copy",
		Long: `backup copies the logbook as it stands at one moment to FILE, which must not exist, and audits the copy. Others may log
meanwhile. FILE appears whole or not at all, and is a logbook like any other: --logbook FILE reads it.

Where the audit finds damage, which the logbook then has too, the copy is kept and the exit code is 3.`,
		Example: `  ringbook logbook backup /media/stick/ringbook-2026-03.db`,
		Args:    words(1, 1),
		RunE: func(cmd *cobra.Command, args []string) error {
			r, err := a.backup(cmd, args[0])
			if err != nil {
				return err
			}
			return a.audited(args[0], r, "The copy is in "+args[0]+" and sound")
		},
	}
}

func (a *app) backup(cmd *cobra.Command, file string) (r store.Report, err error) {
	lb, err := a.read(cmd.Context())
	if err != nil {
		return r, err
	}
	defer closing(lb, &err)
	return lb.Backup(cmd.Context(), file)
}
