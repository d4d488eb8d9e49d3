package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"

	"ringbook/snubber"
	"ringbook/store"

	"github.com/spf13/cobra"
)

func trialImport(a *app) *cobra.Command {
	return &cobra.Command{
		Use:   "import FILE.csv",
		Short: "Log many trials from a CSV file, all or none; or what an export wrote",
		Long: `import logs every row of a CSV file, or none when one is wrong; each wrong row is named by line and column. A dash
reads standard input. The header names the columns, in any order:

  board revision network c c_tol r r_tol probe_c bus_v current_a switching_hz
  ring_hz ring_hz_u decay_s decay_s_u peak_v peak_v_u at part note
  (and, where known: esr measured_c measured_c_u supply_a supply_a_u temp_c temp_c_u session struck)

Values are SI numbers or engineering notation (470p, 2n2, 1.8MHz, 5%); an empty cell was not read. A column guarded, as
'ringbook logbook export' writes it, names the columns of the row whose text has an apostrophe in front that is not part of it.

A file of JSON Lines that 'ringbook logbook export -o FILE.jsonl' wrote is known by its first character. Of it, all that the logbook
does not hold yet is logged, with its identities, waveforms and strikes. Either may be gzipped.`,
		Example: `  ringbook trial import trials.csv
  ringbook trial import everything.jsonl.gz
  ringbook trial import --json - < trials.csv`,
		Args: words(1, 1),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			ctx := cmd.Context()
			in, name := a.stdin, "standard input"
			if args[0] != "-" {
				f, err := openCSV(args[0])
				if err != nil {
					return fmt.Errorf("trial import: %w", err)
				}
				defer f.Close()
				in, name = f, args[0]
			}
			in, lines, err := unpacked(in)
			if err != nil {
				return fmt.Errorf("trial import: nothing was logged: %w", err)
			}
			lb, err := a.open(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			if lines {
				m, err := lb.ImportJSON(ctx, in, a.counted)
				if err != nil {
					return fmt.Errorf("trial import: nothing was logged: %w", err)
				}
				return a.cameIn(m, name)
			}
			n, err := importAll(ctx, lb, in, a.counted)
			switch {
			case err != nil:
				return fmt.Errorf("trial import: nothing was logged: %w", err)
			case n == 0:
				return fmt.Errorf("trial import: nothing was logged: %s holds no trial; write a row for each below the header row", name)
			case a.json:
				return a.printJSON(map[string]any{"logged": n})
			case n == 1:
				return a.say("1 trial logged in %s.", lb.Path())
			}
			return a.say("%d trials logged in %s.", n, lb.Path())
		},
	}
}

// openCSV opens a file to import.
func openCSV(name string) (*os.File, error) {
	f, err := os.Open(name)
	var system *fs.PathError
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil, fmt.Errorf("there is no file %s; check its name and folder", name)
	case errors.As(err, &system):
		return nil, fmt.Errorf("%s cannot be opened: %w; check that this user may read it", name, system.Err)
	case err != nil:
		return nil, err
	}
	if info, err := f.Stat(); err == nil && info.IsDir() {
		f.Close()
		return nil, fmt.Errorf("%s is a folder; name a CSV file in it", name)
	}
	return f, nil
}

// importAll logs all of a CSV's trials or none. What is wrong with the CSV is told as such: the logbook has no part
// in it.
func importAll(ctx context.Context, lb *store.Logbook, in io.Reader, progress func(int)) (int, error) {
	var wrong error
	rows := func(yield func(snubber.Trial, error) bool) {
		for t, err := range store.ReadCSV(in) {
			if err != nil {
				wrong = err
			}
			if !yield(t, err) {
				return
			}
		}
	}
	n, err := lb.AddAll(ctx, rows, progress)
	if err != nil && wrong != nil {
		err = wrong
	}
	return n, err
}
