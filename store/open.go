package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"net/url"
	"os"
	"path/filepath"
	"sync"
	"time"
)

// busyWait is how long a write waits for another program's before it gives up.
const busyWait = 10 * time.Second

// Logbook is an open logbook. It may be used by several goroutines at once, and several programs may have the same file
// open: readers see the whole of the last write, writers take turns.
type Logbook struct {
	path   string
	db     *sql.DB
	wait   time.Duration // how long a write waits for another program's
	turn   chan *writer  // holds the writer while nobody writes; nil for a logbook open for reading alone
	closed sync.Once
}

// Open opens the logbook at path for reading and writing, and makes one where there is no file or an empty one. An older
// schema is brought up to date.
//
// Errors are of kind ErrStranger, ErrNewer, ErrReadOnly, ErrDamaged or ErrBusy; the file is then left as it was.
func Open(ctx context.Context, path string) (*Logbook, error) { return open(ctx, path, busyWait) }

func open(ctx context.Context, path string, wait time.Duration) (*Logbook, error) {
	path, err := locate(path)
	if err != nil {
		return nil, err
	}
	if err := inspect(ctx, path, true); err != nil {
		return nil, err
	}
	db, err := sql.Open("sqlite", dsn(path, "mode=rwc", wait))
	if err != nil {
		return nil, explain(path, err)
	}
	lb := &Logbook{path: path, db: db, wait: wait, turn: make(chan *writer, 1)}
	w, err := prepareFile(ctx, lb)
	if err != nil {
		return nil, errors.Join(explain(path, err), db.Close())
	}
	lb.turn <- w
	return lb, nil
}

// OpenReadOnly opens the logbook at path for reading alone. It works on a write-protected file or folder and on a full disk, where a
// logbook that was closed in an orderly way is read as it stands. One of an older schema is read as it is: a migration only
// adds, and what was not there then reads as none.
//
// Where the file and its folder can be written, the last to close it clears away SQLite's files beside it (-wal and -shm),
// and so finishes what a killed program had committed and left in them; nothing else is written.
//
// Errors are of kind ErrMissing, ErrStranger, ErrNewer, ErrDamaged or ErrBusy.
func OpenReadOnly(ctx context.Context, path string) (*Logbook, error) {
	path, err := locate(path)
	if err != nil {
		return nil, err
	}
	if err := inspect(ctx, path, false); err != nil {
		return nil, err
	}
	// Opened with mode=ro, SQLite makes its files beside a logbook and may not remove them again. So the file is opened as
	// for writing, which SQLite takes for reading where the file is write-protected, and every statement that writes is refused.
	lb, err := openToRead(ctx, path, "mode=rw&_pragma=query_only(1)")
	if (errors.Is(err, ErrReadOnly) || errors.Is(err, ErrFull)) && !holds(path+"-wal") && !holds(path+"-journal") {
		// No place for the files that let readers and writers share; with no writes pending, none are needed.
		lb, err = openToRead(ctx, path, "mode=ro&immutable=1")
	}
	return lb, err
}

func openToRead(ctx context.Context, path, mode string) (*Logbook, error) {
	db, err := sql.Open("sqlite", dsn(path, mode, busyWait))
	if err != nil {
		return nil, explain(path, err)
	}
	var id int32
	var version int
	err = db.QueryRowContext(ctx, "SELECT application_id, user_version FROM pragma_application_id, pragma_user_version").Scan(&id, &version)
	if err != nil {
		return nil, errors.Join(explain(path, err), db.Close())
	}
	latest, err := latestVersion()
	switch {
	case err != nil:
	case id != applicationID:
		err = stranger(path, uint32(id))
	case version > latest:
		err = newer(path, version, latest)
	case version < 1:
		err = &Fault{Path: path, Kind: ErrStranger, What: "it is marked as a logbook and holds no schema of one", Cure: "name another file; this one was left as it is"}
	}
	if err != nil {
		return nil, errors.Join(err, db.Close())
	}
	return &Logbook{path: path, db: db}, nil
}

// Path is the absolute path of the file.
func (lb *Logbook) Path() string { return lb.path }

// Close ends the use of the logbook, after a write in progress. Closing twice is closing once.
func (lb *Logbook) Close() (err error) {
	lb.closed.Do(func() {
		if lb.turn != nil {
			err = (<-lb.turn).close()
			close(lb.turn)
		}
		err = explain(lb.path, errors.Join(err, lb.db.Close()))
	})
	return err
}

// locate makes path absolute and sees that it can be a file.
func locate(path string) (string, error) {
	if path == "" {
		return "", &Fault{Path: `""`, Kind: ErrMissing, What: "it has no name", Cure: "name a file, such as ringbook.db"}
	}
	abs, err := filepath.Abs(path)
	if err != nil {
		return "", fmt.Errorf("logbook %s: %w", path, err)
	}
	return abs, nil
}

// dsn is path as an SQLite URI (https://sqlite.org/uri.html) with the settings of every connection.
func dsn(path, mode string, wait time.Duration) string {
	u := url.URL{Scheme: "file", OmitHost: true, Path: filepath.ToSlash(path)}
	return u.String() + "?" + mode +
		fmt.Sprintf("&_pragma=busy_timeout(%d)", wait.Milliseconds()) +
		"&_pragma=foreign_keys(1)&_pragma=synchronous(FULL)" +
		"&_pragma=recursive_triggers(1)" + // so that a REPLACE meets the triggers that refuse a DELETE
		"&_pragma=cache_size(-4096)" + // KiB for each connection that reads
		"&_pragma=journal_size_limit(67108864)" // bytes of log kept after a bulk import
}

func exists(path string) bool {
	_, err := os.Stat(path)
	return !errors.Is(err, fs.ErrNotExist)
}

// holds is whether there is a file at path, and something in it.
func holds(path string) bool {
	info, err := os.Stat(path)
	return err == nil && info.Size() > 0 || err != nil && !errors.Is(err, fs.ErrNotExist)
}
