package main

import (
	"compress/gzip"
	"context"
	"errors"
	"io"
	"path/filepath"
	"strings"

	"ringbook/recipes"
	"ringbook/snubber"
	"ringbook/store"

	"github.com/spf13/cobra"
)

func logbookExport(a *app) *cobra.Command {
	var scope scopeFlags
	var out string
	var force bool
	cmd := &cobra.Command{
		Use:   "export",
		Short: "Write the trials as CSV, or the whole logbook as JSON Lines",
		Long: `export writes the trials in scope, struck ones too, as CSV to standard output or to the file that -o names, or the whole
logbook to a file that ends in .jsonl; either may end in .gz besides. The file appears whole or not at all.

CSV has the columns of 'ringbook trial import', which reads it back as new trials: every figure to the bit, without
identities, single repeats and waveforms. A text that a spreadsheet would take for a formula gets an apostrophe in front,
and the row's last cell, guarded, names the columns in which it did; trial import takes it off again.

JSON Lines hold everything: trials with their identities, repeats, instruments and waveforms, strikes, decisions, and each
one's link in the chain. 'ringbook trial import' reads them back to the bit, and adds only what is not there yet.`,
		Example: `  ringbook logbook export --board winch-drive --since 2026-03-01 > winch.csv
  ringbook logbook export -o trials.csv
  ringbook logbook export -o everything.jsonl.gz`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			s, err := scope.read()
			if err != nil {
				return err
			}
			s.IncludeStruck = true
			form, err := exportForm(out, a.json)
			if err != nil {
				return err
			}
			if form == asLines && s != (store.Scope{IncludeStruck: true}) {
				return usagef("logbook export: -o %q: JSON Lines are the whole logbook; leave --board, --revision, --since and --until out, or write CSV", out)
			}
			ctx := cmd.Context()
			lb, err := a.read(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			n := 0
			write := func(w io.Writer) (err error) {
				if form == asLines {
					n, err = lb.ExportJSON(ctx, w, a.passing("written"))
				} else {
					n, err = a.exportCSV(ctx, lb, s, w)
				}
				return err
			}
			if out == "" {
				return write(a.stdout)
			}
			if strings.EqualFold(filepath.Ext(out), ".gz") {
				write = gzipped(write)
			}
			if err := recipes.WriteFile(out, force, write); err != nil {
				return err
			}
			what := map[string]string{asCSV: "trials", asLines: "entries"}[form]
			if a.json {
				return a.printJSON(map[string]any{"file": out, what: n})
			}
			return a.say("%d %s are in %s.", n, what, readable(out))
		},
	}
	scope.add(cmd)
	cmd.Flags().StringVarP(&out, "out", "o", "", "write to `FILE`: .csv or .jsonl, and .gz besides")
	cmd.Flags().BoolVar(&force, "force", false, "replace the file")
	return cmd
}

const (
	asCSV   = ".csv"
	asLines = ".jsonl"
)

// exportForm is the form that a file's ending names.
func exportForm(out string, json bool) (string, error) {
	if out == "" {
		if json {
			return "", usagef("logbook export: --json says what was written to a file; name one with -o")
		}
		return asCSV, nil
	}
	name := strings.ToLower(filepath.Base(out))
	name = strings.TrimSuffix(name, ".gz")
	for _, form := range []string{asCSV, asLines} {
		if strings.HasSuffix(name, form) && name != form {
			return form, nil
		}
	}
	return "", usagef("logbook export: -o %q: its ending must be .csv or .jsonl, or one of them with .gz", out)
}

func (a *app) exportCSV(ctx context.Context, lb *store.Logbook, s store.Scope, w io.Writer) (int, error) {
	if _, err := recipes.RevisionsInScope(ctx, lb, s); err != nil { // it says what there is instead
		return 0, err
	}
	return writeGuarded(w, func(yield func(snubber.Trial, error) bool) {
		n := 0
		for t, err := range lb.Trials(ctx, s) {
			if n++; n%1000 == 0 {
				a.counted(n)
			}
			if !yield(t, err) {
				return
			}
		}
	})
}

func gzipped(write func(io.Writer) error) func(io.Writer) error {
	return func(w io.Writer) error {
		z := gzip.NewWriter(w)
		return errors.Join(write(z), z.Close())
	}
}
