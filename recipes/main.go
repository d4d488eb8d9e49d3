package recipes

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"os/signal"
	"strings"
	"syscall"

	"ringbook/recipes/page"
	"ringbook/store"
)

// Main is the whole main function of a program that is one recipe:
//
//	func main() { recipes.Main(recipes.Recipe{Name: "heights", Title: "Peaks", Single: true, Weave: heights}) }
//
// It takes the flags -logbook FILE, -board NAME, -revision NAME, and -o FILE for the page, with -force where the file
// exists; without -o the page is printed. It ends the program: with 0, with 1 where the recipe failed or its page could not be
// written, with 2 where the command line is wrong.
func Main(r Recipe) {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	context.AfterFunc(ctx, stop) // a second Ctrl-C ends the program at once
	code := run(ctx, r, os.Args[1:], os.Stdout, os.Stderr)
	stop()
	os.Exit(code)
}

func run(ctx context.Context, r Recipe, args []string, stdout, stderr io.Writer) int {
	var src Source
	var out string
	var force bool
	path := os.Getenv("RINGBOOK_LOGBOOK")
	if path == "" {
		path = "ringbook.db"
	}
	f := flag.NewFlagSet(r.Name, flag.ContinueOnError)
	f.SetOutput(stderr)
	f.StringVar(&path, "logbook", path, "the logbook `FILE` (or RINGBOOK_LOGBOOK)")
	f.StringVar(&src.Scope.Board, "board", "", "trials of the board of this `NAME` alone")
	f.StringVar(&src.Scope.Revision, "revision", "", "trials of the revision of this `NAME` alone")
	f.StringVar(&out, "o", "", "write the page to `FILE`: "+strings.Join(endings[:], " "))
	f.BoolVar(&force, "force", false, "replace the file")
	if err := f.Parse(args); errors.Is(err, flag.ErrHelp) {
		return 0
	} else if err != nil {
		return 2 // the flag set has said why
	}
	tell := func(code int, err error) int {
		fmt.Fprintf(stderr, "%s: %s\n", r.Name, strings.ReplaceAll(err.Error(), "\n", "; "))
		return code
	}
	if f.NArg() > 0 {
		return tell(2, fmt.Errorf("%q is one word too many; see -help", f.Arg(0)))
	}
	var file *File
	var err error
	if out != "" {
		if file, err = NewFile(out, force); errors.Is(err, ErrEnding) {
			return tell(2, err)
		} else if err != nil {
			return tell(1, err)
		}
	}
	if src.Logbook, err = store.OpenReadOnly(ctx, path); err != nil {
		return tell(1, err)
	}
	defer src.Logbook.Close() // it only reads
	woven, err := r.Page(ctx, src)
	switch {
	case errors.Is(err, context.Canceled):
		return tell(1, errors.New("interrupted"))
	case errors.Is(err, ErrSeveral):
		return tell(2, err)
	case err != nil && (woven == nil || woven.Empty):
		return tell(1, err)
	}
	code := 0
	if err != nil {
		code = tell(1, err)
	}
	if file != nil {
		_, err = file.Write(woven.Page)
	} else {
		err = woven.Text(stdout, page.TextOptions{Prose: true})
	}
	if err != nil {
		return tell(1, err)
	}
	return code
}
