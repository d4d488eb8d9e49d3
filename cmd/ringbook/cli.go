package main

import (
	"errors"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

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
		form := strings.TrimSuffix(cmd.UseLine(), " [flags]")
		switch {
		case len(args) < least:
			return usagef("`%s` is not complete; the form is `%s`", cmd.CommandPath(), form)
		case len(args) > most:
			return usagef("%q is one word too many; the form is `%s`", args[most], form)
		}
		return nil
	}
}

// flagError says what is wrong with a flag: its name, what was typed, the cure.
func flagError(cmd *cobra.Command, err error) error {
	if errors.Is(err, pflag.ErrHelp) {
		return err
	}
	var unknown *pflag.NotExistError
	var bare *pflag.ValueRequiredError
	var value *pflag.InvalidValueError
	switch {
	case errors.As(err, &unknown):
		flag := "--" + unknown.GetSpecifiedName()
		if short := unknown.GetSpecifiedShortnames(); short != "" {
			flag = "-" + short
		}
		return usagef("there is no flag %s here; see `%s --help`", flag, cmd.CommandPath())
	case errors.As(err, &bare):
		return usagef("--%s needs a value; see `%s --help`", bare.GetSpecifiedName(), cmd.CommandPath())
	case errors.As(err, &value):
		return usagef("--%s %q: %s; see `%s --help`", value.GetFlag().Name, value.GetValue(), reason(value), cmd.CommandPath())
	}
	return usagef("%w; see `%s --help`", err, cmd.CommandPath())
}

// reason is why a flag's value was refused, without the value, which stands before it.
func reason(e *pflag.InvalidValueError) string {
	switch e.GetFlag().Value.Type() {
	case "bool":
		return "it must be true or false"
	case "int", "uint64":
		return "it must be a whole number"
	}
	why := e.Unwrap().Error()
	if _, after, found := strings.Cut(why, `"`+e.GetValue()+`": `); found {
		return after
	}
	return why
}

// completes offers the values of a flag to the shell.
func completes(cmd *cobra.Command, flag string, values ...string) {
	// It fails for a flag that is not there or has values already, and then the shell offers none.
	_ = cmd.RegisterFlagCompletionFunc(flag, cobra.FixedCompletions(values, cobra.ShellCompDirectiveNoFileComp))
}

func helpCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "help [COMMAND]",
		Short: "What a command does, and its flags",
		Example: `  ringbook help
  ringbook help trial take`,
		RunE: func(cmd *cobra.Command, args []string) error {
			found, rest, err := cmd.Root().Find(args)
			if err != nil {
				return &usageError{err}
			}
			if len(rest) > 0 {
				return knownCommand(found, rest)
			}
			found.InitDefaultHelpFlag()
			return found.Help()
		},
	}
}

// shells are those whose completion there is.
var shells = [...]string{"bash", "fish", "powershell", "zsh"}

func completionCommand(a *app) *cobra.Command {
	return &cobra.Command{
		Use:   "completion SHELL",
		Short: "Print what lets a shell complete commands and flags",
		Long: `completion prints a script for bash, fish, powershell or zsh. The shell that reads it completes the commands, their
flags and the values of some flags. For bash it needs the bash-completion package.`,
		Example: `  source <(ringbook completion bash)
  ringbook completion fish > ~/.config/fish/completions/ringbook.fish
  ringbook completion zsh > "${fpath[1]}/_ringbook"`,
		Args:      words(1, 1),
		ValidArgs: shells[:],
		RunE: func(cmd *cobra.Command, args []string) error {
			root := cmd.Root()
			switch args[0] {
			case "bash":
				return root.GenBashCompletionV2(a.stdout, true)
			case "fish":
				return root.GenFishCompletion(a.stdout, true)
			case "powershell":
				return root.GenPowerShellCompletionWithDesc(a.stdout)
			case "zsh":
				return root.GenZshCompletion(a.stdout)
			}
			return usagef("completion %q: it must be one of %s", args[0], strings.Join(shells[:], ", "))
		},
	}
}
