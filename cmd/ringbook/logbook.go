package main

import (
	"context"
	"fmt"
	"strings"
	"unicode"

	"ringbook/store"

	"github.com/spf13/cobra"
)

func logbookCommand(a *app) *cobra.Command {
	return group("logbook", "Audit the logbook, back it up, merge another, export it",
		`  ringbook logbook audit
  ringbook logbook backup /media/stick/ringbook-2026-03.db
  ringbook logbook merge other-bench.db
  ringbook logbook export -o trials.csv`,
		logbookAudit(a), logbookBackup(a), logbookMerge(a), logbookExport(a))
}

// passing shows how far a pass over the whole logbook is: in place on a terminal, else a line for each 100,000 entries.
func (a *app) passing(what string) func(done, all int64) {
	const often = 100_000
	said := int64(0)
	return func(done, all int64) {
		switch {
		case a.quiet:
		case isTerminal(a.stderr):
			fmt.Fprintf(a.stderr, "\r%d of %d entries %s\r", done, all, what)
		case done/often > said:
			said = done / often
			a.progress("%d of %d entries %s", done, all, what)
		}
	}
}

// auditAnswer is what an audit found, as --json has it.
type auditAnswer struct {
	File        string         `json:"file"`
	Sound       bool           `json:"sound"`
	Logbook     string         `json:"logbook"` // its id
	Schema      int            `json:"schema"`
	Head        string         `json:"head"` // the chain's last link
	Entries     int            `json:"entries"`
	Trials      int            `json:"trials"`
	Strikes     int            `json:"strikes"`
	Decisions   int            `json:"decisions"`
	Corrections int            `json:"corrections"`
	Merged      int            `json:"merged"` // of the entries, from other logbooks
	Damage      []damageAnswer `json:"damage"` // the first that differs first
	More        int            `json:"more"`   // how much more is wrong
	Warning     string         `json:"warning"`
}

type damageAnswer struct {
	Kind  string `json:"kind"`
	ID    string `json:"id"`
	Entry int64  `json:"entry"`
	What  string `json:"what"`
}

// audited says what an audit of the logbook at path found. Damage is the answer no.
func (a *app) audited(path string, r store.Report, sound string) error {
	if a.json {
		answer := auditAnswer{path, r.Sound(), r.Logbook, r.Schema, r.Head, r.Entries, r.Trials, r.Strikes, r.Decisions, r.Corrections,
			r.Merged, []damageAnswer{}, r.More, r.Warning}
		for _, d := range r.Damage {
			answer.Damage = append(answer.Damage, damageAnswer(d))
		}
		if err := a.printJSON(answer); err != nil {
			return err
		}
	} else if err := a.say("%s", readable(verdict(path, r, sound))); err != nil {
		return err
	}
	if !r.Sound() {
		return errNo
	}
	return nil
}

// verdict is what an audit found, in one sentence.
func verdict(path string, r store.Report, sound string) string {
	switch {
	case !r.Sound():
		more := ""
		if n := len(r.Damage) - 1 + r.More; n > 0 {
			more = fmt.Sprintf(" (and %d more; --json lists them)", n)
		}
		return fmt.Sprintf("%s is damaged: %s%s; keep the file as it is, and work from a backup.", path, r.Damage[0], more)
	case r.Warning != "":
		return fmt.Sprintf("%s; of its entries nothing can be told: %s.", sound, r.Warning)
	}
	kinds := kinds(r.Trials, r.Strikes, r.Decisions, r.Corrections)
	if r.Merged > 0 {
		kinds += fmt.Sprintf("; %d from other logbooks", r.Merged)
	}
	return fmt.Sprintf("%s: %s (%s), the last with link %s.", sound, number(r.Entries, "entry", "entries"), kinds, r.Head)
}

// kinds counts entries in words, those there are.
func kinds(trials, strikes, decisions, corrections int) string {
	var said []string
	for _, x := range []struct {
		n         int
		one, many string
	}{
		{trials, "trial", "trials"}, {strikes, "strike", "strikes"}, {decisions, "decision", "decisions"},
		{corrections, "correction of a board", "corrections of boards"},
	} {
		if x.n > 0 {
			said = append(said, number(x.n, x.one, x.many))
		}
	}
	if len(said) == 0 {
		return "no trial"
	}
	return strings.Join(said, ", ")
}

func number(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}

// readable keeps what a damaged file or a file's name may hold from moving a terminal's cursor.
func readable(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) || unicode.Is(unicode.Cf, r) {
			return unicode.ReplacementChar
		}
		return r
	}, s)
}

// readFirst sees that the logbook at path can be read, before another is opened for writing, and made where there is none.
func readFirst(ctx context.Context, path string) error {
	lb, err := store.OpenReadOnly(ctx, path)
	if err != nil {
		return err
	}
	return lb.Close()
}
