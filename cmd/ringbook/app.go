package main

import (
	"context"
	"encoding/json"
	"fmt"
	"io"
	"os"
	"strconv"

	"ringbook/recipes/page"
	"ringbook/store"

	"github.com/spf13/cobra"
)

// app is what every command shares: where to read and write, and the global flags.
type app struct {
	stdin          io.Reader
	stdout, stderr io.Writer

	logbook string
	json    bool
	quiet   bool
	color   string
}

func newRoot(a *app) *cobra.Command {
	root := &cobra.Command{
		Use:   "ringbook",
		Short: "A laboratory logbook that fits a ringing loop and recommends its snubber",
		Long: `ringbook reads the instruments of a bench, keeps every trial of a snubber with its uncertainty in a
logbook, fits the ringing loop's parasitics across all trials, and recommends the parts.

Exit codes: 0 done; 1 the job failed; 2 the command line is wrong; 3 done, but the answer is no.`,
		Example: `  ringbook demo
  ringbook trial import trials.csv
  ringbook fit --board winch-drive --revision B`,
		SilenceUsage:  true,
		SilenceErrors: true,
		Args:          knownCommand,
		RunE:          showHelp,
		PersistentPreRunE: func(cmd *cobra.Command, args []string) error {
			switch a.color {
			case "auto", "always", "never":
				return nil
			}
			return usagef("--color %q: it must be auto, always or never", a.color)
		},
	}
	root.SetIn(a.stdin)
	root.SetOut(a.stdout)
	root.SetErr(a.stderr)
	root.SetFlagErrorFunc(flagError)
	root.SetHelpCommand(helpCommand())
	root.CompletionOptions.DisableDefaultCmd = true // completionCommand says it in this program's words
	path := os.Getenv("RINGBOOK_LOGBOOK")
	if path == "" {
		path = "ringbook.db"
	}
	f := root.PersistentFlags()
	f.StringVar(&a.logbook, "logbook", path, "the logbook `FILE` (or RINGBOOK_LOGBOOK)")
	f.BoolVar(&a.json, "json", false, "print one JSON object and nothing else")
	f.BoolVar(&a.quiet, "quiet", false, "no progress")
	f.StringVar(&a.color, "color", "auto", "`WHEN` to colour: auto, always or never; NO_COLOR is honoured")
	completes(root, "color", "auto", "always", "never")
	root.AddCommand(demoCommand(a), boardCommand(a), trialCommand(a), substituteCommand(a), fitCommand(a), recommendCommand(a), confirmCommand(a), compareCommand(a), waveformCommand(a), historyCommand(a), logbookCommand(a), pageCommand(a), instrumentCommand(a), benchCommand(a),
		completionCommand(a))
	return root
}

// open opens the logbook for writing; close reports into err.
func (a *app) open(ctx context.Context) (*store.Logbook, error) { return store.Open(ctx, a.logbook) }

// read opens the logbook for reading.
func (a *app) read(ctx context.Context) (*store.Logbook, error) {
	return store.OpenReadOnly(ctx, a.logbook)
}

// closing closes the logbook and keeps the first error.
func closing(lb *store.Logbook, err *error) {
	if e := lb.Close(); e != nil && *err == nil {
		*err = e
	}
}

// printJSON writes one object and nothing else.
func (a *app) printJSON(v any) error {
	enc := json.NewEncoder(a.stdout)
	enc.SetEscapeHTML(false)
	enc.SetIndent("", "  ")
	if err := enc.Encode(v); err != nil {
		return fmt.Errorf("writing the answer: %w", err)
	}
	return nil
}

// print writes a page to the terminal.
func (a *app) print(p *page.Page) error {
	return p.Text(a.stdout, page.TextOptions{Width: a.width(), Colour: a.colour()})
}

// say writes one line of result.
func (a *app) say(format string, args ...any) error {
	_, err := fmt.Fprintf(a.stdout, format+"\n", args...)
	return err
}

// progress writes one line for the person who waits, on stderr.
func (a *app) progress(format string, args ...any) {
	if !a.quiet {
		fmt.Fprintf(a.stderr, format+"\n", args...)
	}
}

// counted shows how many trials a long import has read: in place on a terminal, else a line now and then.
func (a *app) counted(n int) {
	switch {
	case a.quiet:
	case isTerminal(a.stderr):
		fmt.Fprintf(a.stderr, "\r%d trials read\r", n)
	case n%100_000 == 0:
		a.progress("%d trials read", n)
	}
}

// width is the terminal's, from COLUMNS where the shell gives it; 0 where it is not known.
func (a *app) width() int {
	n, err := strconv.Atoi(os.Getenv("COLUMNS"))
	if err != nil || n < 0 {
		return 0
	}
	return n
}

// colour follows --color, and NO_COLOR (no-color.org) where that is auto.
func (a *app) colour() bool {
	switch a.color {
	case "always":
		return true
	case "never":
		return false
	}
	if os.Getenv("NO_COLOR") != "" || os.Getenv("TERM") == "dumb" {
		return false
	}
	return isTerminal(a.stdout)
}

func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	if !ok {
		return false
	}
	info, err := f.Stat()
	return err == nil && info.Mode()&os.ModeCharDevice != 0
}
