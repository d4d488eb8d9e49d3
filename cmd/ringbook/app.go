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
	root.SetFlagErrorFunc(func(cmd *cobra.Command, err error) error {
		return usagef("%w; see `%s --help`", err, cmd.CommandPath())
	})
	path := os.Getenv("RINGBOOK_LOGBOOK")
	if path == "" {
		path = "ringbook.db"
	}
	f := root.PersistentFlags()
	f.StringVar(&a.logbook, "logbook", path, "the logbook file (or RINGBOOK_LOGBOOK)")
	f.BoolVar(&a.json, "json", false, "print one JSON object and nothing else")
	f.BoolVar(&a.quiet, "quiet", false, "no progress")
	f.StringVar(&a.color, "color", "auto", "auto, always or never; NO_COLOR is honoured")
	root.AddCommand(demoCommand(a), boardCommand(a), trialCommand(a), fitCommand(a), recommendCommand(a), historyCommand(a), benchCommand(a))
	return root
}

// group is a command that only holds others.
func group(use, short, example string, commands ...*cobra.Command) *cobra.Command {
	c := &cobra.Command{Use: use, Short: short, Example: example, Args: knownCommand, RunE: showHelp}
	c.AddCommand(commands...)
	return c
}

func showHelp(cmd *cobra.Command, args []string) error { return cmd.Help() }

// knownCommand refuses a word that names no command.
func knownCommand(cmd *cobra.Command, args []string) error {
	if len(args) == 0 {
		return nil
	}
	return usagef("there is no command %q here; see `%s --help`", args[0], cmd.CommandPath())
}

// words takes between least and most arguments.
func words(least, most int) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		switch {
		case len(args) < least:
			return usagef("%s is not complete; the form is `%s`", cmd.CommandPath(), cmd.UseLine())
		case len(args) > most:
			return usagef("%q is one word too many; the form is `%s`", args[most], cmd.UseLine())
		}
		return nil
	}
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
	f, ok := a.stdout.(*os.File)
	if !ok {
		return false
	}
	info, err := f.Stat()
	return err == nil && info.Mode()&os.ModeCharDevice != 0
}
