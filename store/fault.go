package store

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"strings"

	"modernc.org/sqlite"
	sqlite3 "modernc.org/sqlite/lib"
)

// What can be wrong with a logbook's file or with what was asked of it. Test for them with errors.Is; the error itself
// is a Fault, or a sentence that names the trial.
var (
	ErrMissing    = errors.New("no logbook there")
	ErrStranger   = errors.New("not a logbook")
	ErrNewer      = errors.New("from a newer version")
	ErrReadOnly   = errors.New("not writable")
	ErrDamaged    = errors.New("damaged")
	ErrBusy       = errors.New("busy")
	ErrFull       = errors.New("no room on the disk")
	ErrNoTrial    = errors.New("no such trial")
	ErrNoDecision = errors.New("no such decision")
	ErrStruck     = errors.New("already struck")
)

// Fault is a logbook's file that cannot be used as asked, with the cure.
type Fault struct {
	Path string // the file
	What string // what is wrong with it
	Cure string // what to do
	Kind error  // one of the Err... values, or nil
	Err  error  // the cause as SQLite or the system put it; nil where there is none
}

func (f *Fault) Error() string { return fmt.Sprintf("logbook %s: %s; %s", f.Path, f.What, f.Cure) }

// Unwrap gives the kind and the cause to errors.Is and errors.As.
func (f *Fault) Unwrap() []error {
	var all []error
	for _, err := range []error{f.Kind, f.Err} {
		if err != nil {
			all = append(all, err)
		}
	}
	return all
}

// explain turns what SQLite or the system said into what a person can act on. Errors that are already a sentence of ours
// and the end of a context pass through.
func explain(path string, err error) error {
	var ours *Fault
	if err == nil || errors.As(err, &ours) || errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) {
		return err
	}
	f := &Fault{Path: path, Err: err}
	var lite *sqlite.Error
	if !errors.As(err, &lite) {
		if errors.Is(err, fs.ErrPermission) {
			f.Kind, f.What, f.Cure = ErrReadOnly, "this user may not open it", "ask its owner for access, or name another file"
			return f
		}
		return fmt.Errorf("logbook %s: %w", path, err)
	}
	code := lite.Code() & 0xff
	if lite.Code() == sqlite3.SQLITE_IOERR_SHMSIZE { // no room for the file that readers and writers share
		code = sqlite3.SQLITE_FULL
	}
	switch code {
	case sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED:
		f.Kind = ErrBusy
		f.What = "another program kept it locked for longer than " + busyWait.String()
		f.Cure = "let that program finish (a long import, perhaps) and try again; nothing was written"
	case sqlite3.SQLITE_CORRUPT:
		f.Kind, f.What = ErrDamaged, "the file is damaged ("+plain(lite)+")"
		f.Cure = "keep it as it is, work from a backup, and copy out of it what can still be read"
	case sqlite3.SQLITE_NOTADB:
		f.Kind, f.What, f.Cure = ErrStranger, "it is not an SQLite file", "name another file; this one was left as it is"
	case sqlite3.SQLITE_READONLY, sqlite3.SQLITE_PERM:
		f.Kind, f.What = ErrReadOnly, "the file or its folder is read-only"
		f.Cure = "make both writable, or copy the logbook to a folder that is"
	case sqlite3.SQLITE_CANTOPEN:
		f.Kind, f.What = ErrReadOnly, "the file cannot be opened ("+plain(lite)+")"
		f.Cure = "see that its folder exists and that this user may write in it"
	case sqlite3.SQLITE_FULL:
		f.Kind, f.What, f.Cure = ErrFull, "the disk is full", "make room and try again; nothing was written"
	case sqlite3.SQLITE_IOERR:
		f.What, f.Cure = "the disk failed to read or write ("+plain(lite)+")", "check the disk and its free space; nothing was written"
	default:
		return fmt.Errorf("logbook %s: %w", path, err)
	}
	return f
}

// plain is SQLite's message without the driver's trailing code.
func plain(err *sqlite.Error) string {
	s := err.Error()
	if i := strings.LastIndex(s, " ("); i > 0 {
		s = s[:i]
	}
	return s
}
