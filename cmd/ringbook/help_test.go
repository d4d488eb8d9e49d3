package main

import (
	"fmt"
	"strings"
	"testing"

	"github.com/spf13/cobra"
)

// everyCommand is this program's commands, its root first.
func everyCommand() []*cobra.Command {
	root := newRoot(&app{})
	root.InitDefaultHelpCmd()
	return below(root)
}

func below(c *cobra.Command) []*cobra.Command {
	all := []*cobra.Command{c}
	for _, sub := range c.Commands() {
		all = append(all, below(sub)...)
	}
	return all
}

// Every command says what it does, and every example is a command line that this program takes.
func TestExamples(t *testing.T) {
	for _, c := range everyCommand() {
		if c.Short == "" || c.Example == "" {
			t.Errorf("%s: short %q, example %q", c.CommandPath(), c.Short, c.Example)
		}
		if strings.HasSuffix(c.Short, ".") {
			t.Errorf("%s: short %q", c.CommandPath(), c.Short)
		}
		lines := strings.Split(strings.ReplaceAll(c.Example, "\\\n", " "), "\n")
		for _, line := range lines {
			if err := takes(line); err != nil {
				t.Errorf("%s: example %q: %v", c.CommandPath(), line, err)
			}
		}
	}
}

// takes says whether a shell line is a command line of this program, without running it.
func takes(line string) error {
	line = strings.TrimSpace(line)
	line = strings.TrimSuffix(strings.TrimPrefix(line, "source <("), ")")
	for _, shell := range []string{" > ", " < ", " &", " | "} {
		line, _, _ = strings.Cut(line, shell)
	}
	args := shellWords(line)
	if len(args) == 0 || args[0] != "ringbook" {
		return fmt.Errorf("it does not call ringbook")
	}
	root := newRoot(&app{})
	root.InitDefaultHelpCmd()
	c, rest, err := root.Find(args[1:])
	if err != nil {
		return err
	}
	if err := c.ParseFlags(rest); err != nil {
		return err
	}
	return c.ValidateArgs(c.Flags().Args())
}

// shellWords splits a line at spaces outside double quotes.
func shellWords(line string) []string {
	var words []string
	quoted := false
	for i, part := range strings.Split(line, `"`) {
		if quoted = i%2 == 1; quoted {
			words = append(words, part)
			continue
		}
		words = append(words, strings.Fields(part)...)
	}
	return words
}

func TestTakes(t *testing.T) {
	for _, bad := range []string{"ringbook fti", "ringbook fit --bord x", "ringbook trial import", "rinbook fit", "ringbook trial enter --c 470q"} {
		if takes(bad) == nil {
			t.Errorf("%q passes as an example", bad)
		}
	}
}
