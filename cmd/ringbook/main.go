// Command ringbook is the laboratory logbook that computes: it reads the instruments of a bench, keeps every
// trial of a snubber with its uncertainty, fits the ringing loop's parasitics across them, and recommends the parts.
//
// Each command stands in a file of its own; here the outcome becomes an exit code:
//
//	0  done
//	1  the job failed, and why
//	2  the command line is wrong
//	3  done, but the answer is no
package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"strings"
	"syscall"

	"ringbook/store"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	context.AfterFunc(ctx, stop) // a second Ctrl-C ends the program at once
	err := run(ctx, os.Args[1:], os.Stdin, os.Stdout, os.Stderr)
	stop()
	os.Exit(exitCode(err, os.Stderr))
}

// run is the whole command.
func run(ctx context.Context, args []string, stdin io.Reader, stdout, stderr io.Writer) error {
	root := newRoot(&app{stdin: stdin, stdout: stdout, stderr: stderr})
	root.SetArgs(args)
	return root.ExecuteContext(ctx)
}

// usageError is a command line that is wrong.
type usageError struct{ err error }

func (e *usageError) Error() string { return e.err.Error() }
func (e *usageError) Unwrap() error { return e.err }

func usagef(format string, args ...any) error { return &usageError{fmt.Errorf(format, args...)} }

// errNo is a job done whose answer is no; the answer has been printed.
var errNo = errors.New("the answer is no")

func exitCode(err error, stderr io.Writer) int {
	var usage *usageError
	switch {
	case err == nil:
		return 0
	case errors.Is(err, errNo):
		return 3
	case errors.As(err, &usage):
		fmt.Fprintf(stderr, "ringbook: %v\n", err)
		return 2
	case errors.Is(err, context.Canceled):
		fmt.Fprintln(stderr, "ringbook: interrupted; what was logged before stands")
		return 1
	default:
		between := "; " // an error is one line
		var rows *store.BadRows
		if errors.As(err, &rows) {
			between = "\n  " // but each bad row of a file has its own
		}
		fmt.Fprintf(stderr, "ringbook: %s\n", strings.ReplaceAll(err.Error(), "\n", between))
		return 1
	}
}
