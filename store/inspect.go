package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"modernc.org/sqlite"
	sqlite3 "modernc.org/sqlite/lib"
)

// applicationID marks a logbook in bytes 68 to 71 of its file (https://sqlite.org/fileformat2.html, 1.3.14): "rngb".
const applicationID = 0x726E6762

// inspect looks at the file's header before anything may write to it: a stranger's file, and one from a newer version,
// are refused without a lock, a journal or a changed byte. An absent or empty file is a logbook yet to be made, where
// mayMake says so.
//
// The header is read through SQLite as an immutable file rather than by os.Open: to close any descriptor of a file drops
// every POSIX lock this process holds on it, and another Logbook may hold some.
func inspect(ctx context.Context, path string, mayMake bool) error {
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		if dir := filepath.Dir(path); !exists(dir) {
			return &Fault{Path: path, Kind: ErrMissing, What: "its folder does not exist", Cure: "make " + dir + " first, or name another file"}
		}
		return notMade(path, mayMake)
	case err != nil:
		return explain(path, err)
	case info.IsDir():
		return &Fault{Path: path, Kind: ErrStranger, What: "it is a folder", Cure: "name a file in it, such as " + filepath.Join(path, "ringbook.db")}
	case !info.Mode().IsRegular():
		return &Fault{Path: path, Kind: ErrStranger, What: "it is not a regular file", Cure: "name another file"}
	case info.Size() == 0:
		return notMade(path, mayMake)
	}

	id, version, err := header(ctx, path)
	var lite *sqlite.Error
	switch {
	case errors.As(err, &lite) && lite.Code()&0xff == sqlite3.SQLITE_CORRUPT:
		// No lock is held, so that another program may have been writing just then; or one was killed while it wrote, and
		// left the log or journal by which SQLite makes the file whole. Who opens it next, under locks, finds out.
		return nil
	case err != nil:
		return explain(path, err)
	case id != applicationID:
		return stranger(path, id)
	}
	latest, err := latestVersion()
	if err != nil {
		return err
	}
	if version > latest {
		return newer(path, version, latest)
	}
	return nil
}

func header(ctx context.Context, path string) (id uint32, version int, err error) {
	db, err := sql.Open("sqlite", dsn(path, "mode=ro&immutable=1", 0))
	if err != nil {
		return 0, 0, err
	}
	defer func() { err = errors.Join(err, db.Close()) }()
	var signed int32
	err = db.QueryRowContext(ctx, "SELECT application_id, user_version FROM pragma_application_id, pragma_user_version").
		Scan(&signed, &version)
	return uint32(signed), version, err
}

func notMade(path string, mayMake bool) error {
	if mayMake {
		return nil
	}
	return &Fault{Path: path, Kind: ErrMissing, What: "there is no logbook in that place", Cure: "log a trial to make one, or name the right file"}
}

func stranger(path string, id uint32) error {
	f := &Fault{Path: path, Kind: ErrStranger, What: "it is another program's SQLite database", Cure: "name another file; this one was left as it is"}
	if id != 0 {
		f.What += fmt.Sprintf(" (application id %#x)", id)
	}
	return f
}

func newer(path string, version, latest int) error {
	return &Fault{Path: path, Kind: ErrNewer,
		What: fmt.Sprintf("a newer ringbook wrote it (schema %d; this one knows schemas up to %d)", version, latest),
		Cure: fmt.Sprintf("use a ringbook that knows schema %d", version)}
}

func isBusy(err *sqlite.Error) bool {
	code := err.Code() & 0xff
	return code == sqlite3.SQLITE_BUSY || code == sqlite3.SQLITE_LOCKED
}
