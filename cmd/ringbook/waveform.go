package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"

	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/waveform"
	"ringbook/store"

	"github.com/spf13/cobra"
)

func waveformCommand(a *app) *cobra.Command {
	var trial, against, out string
	var force bool
	cmd := &cobra.Command{
		Use:   "waveform [FILE...]",
		Short: "Ring frequency, decay, peak and spectrum of a captured edge",
		Long: `waveform reads the samples of a captured edge and fits the ring after it: its frequency as seen, the 1/e time of its
envelope, the peak, the level it settles at, each with its uncertainty, and its line in the spectrum. Where no ring stands
out of the noise it says so.

FILE is CSV, gzipped or not: two columns, time in seconds and volts, evenly sampled; a header row and # comments are allowed.
Several files are captures of one edge and are averaged, aligned to a fraction of a sample. --trial reads the captures
that are logged with a trial, in place of files: the trial's own readings stay as they are.`,
		Example: `  ringbook waveform edge.csv
  ringbook waveform edge-1.csv.gz edge-2.csv.gz edge-3.csv.gz --json
  ringbook waveform with-snubber.csv --against bare.csv -o with-snubber.html
  ringbook waveform --trial 8e1c04`,
		Args: words(0, 1000),
		RunE: func(cmd *cobra.Command, args []string) error {
			ctx := cmd.Context()
			file, err := outFile(out, force)
			if err != nil {
				return err
			}
			var records []waveform.Record
			title := "The captured edge"
			switch {
			case trial != "" && len(args) > 0:
				return usagef("waveform: %q and --trial %q: give one or the other", args[0], trial)
			case trial != "":
				title = "The edge of trial " + trial
				records, err = a.loggedCaptures(ctx, trial)
			case len(args) == 0:
				return usagef("waveform: no FILE; give a capture as CSV, or --trial for one that is logged")
			default:
				records, err = readCaptures(args)
			}
			if err != nil {
				return err
			}
			got, err := recipes.ReadCaptures(ctx, records)
			if err != nil {
				return fmt.Errorf("waveform: %w", err)
			}
			if against != "" {
				if err := compareCapture(ctx, got, against); err != nil {
					return fmt.Errorf("waveform: %w", err)
				}
			}
			p := page.New(title)
			recipes.Waveform(p, got)
			if file != nil {
				if _, err := file.Write(p); err != nil {
					return fmt.Errorf("waveform: %w", err)
				}
			}
			if a.json {
				return a.printJSON(got)
			}
			return a.print(p)
		},
	}
	cmd.Flags().StringVar(&trial, "trial", "", "`ID` of the trial whose logged captures to read")
	cmd.Flags().StringVar(&against, "against", "", "`FILE` with the capture to compare the spectrum with, the bare node's, say")
	cmd.Flags().StringVarP(&out, "out", "o", "", "write the page with its plots to `FILE` too: .html, .md, .csv, .tex or .txt")
	cmd.Flags().BoolVar(&force, "force", false, "replace the file")
	return cmd
}

func compareCapture(ctx context.Context, got *recipes.Captured, path string) error {
	records, err := readCaptures([]string{path})
	if err != nil {
		return err
	}
	other, err := recipes.ReadCaptures(ctx, records)
	if err != nil {
		return err
	}
	return got.Against(other)
}

// readCaptures reads one record from each file.
func readCaptures(paths []string) ([]waveform.Record, error) {
	var records []waveform.Record
	for _, path := range paths {
		f, err := os.Open(path)
		if errors.Is(err, os.ErrNotExist) {
			return nil, fmt.Errorf("waveform: there is no file %s; save the capture as CSV, time in seconds and volts, and name it here", path)
		}
		if err != nil {
			return nil, fmt.Errorf("waveform: %w", err)
		}
		r, err := waveform.ReadCSV(f, path)
		f.Close()
		if err != nil {
			return nil, fmt.Errorf("waveform: %w", err)
		}
		r.Origin = filepath.Base(path) // where it lies is this machine's business
		records = append(records, r)
	}
	return records, nil
}

// loggedCaptures are the captures logged with a trial.
func (a *app) loggedCaptures(ctx context.Context, trial string) (records []waveform.Record, err error) {
	lb, err := a.read(ctx)
	if err != nil {
		return nil, err
	}
	defer closing(lb, &err)
	for w, err := range lb.Waveforms(ctx, trial) {
		if err != nil {
			return nil, err
		}
		records = append(records, w.Record)
	}
	if len(records) == 0 {
		return nil, fmt.Errorf("waveform: trial %s has no capture with it; take the next with `ringbook trial take --waveform`", store.ShortID(trial))
	}
	return records, nil
}

// fromCaptures adds to a trial what its captures show of ring frequency, decay and peak, but for what it has already. The
// warnings say what spoils these.
func fromCaptures(ctx context.Context, t *snubber.Trial, records []waveform.Record) (warnings []string, err error) {
	got, err := recipes.ReadCaptures(ctx, records)
	if err != nil {
		return nil, fmt.Errorf("waveform: %w", err)
	}
	if warnings = got.Warnings; !got.Ringing {
		warnings = append([]string{"no ring stands out of the waveform's noise, so that it gives no frequency and no decay"}, warnings...)
	}
	for _, r := range got.Readings() {
		if _, typed := t.Reading(r.Quantity); !typed {
			t.Readings = append(t.Readings, r)
		}
	}
	return warnings, nil
}
