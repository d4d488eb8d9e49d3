package store

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
)

// Backup copies the logbook, which others may be writing to, as it stands at one moment to a new file at path, and audits the
// copy. The file appears under its name whole and on the disk, or not at all; one that is there is never replaced, and is an
// error of kind fs.ErrExist. Where the audit finds damage, which the logbook then has too, the copy is kept, and the Report says so.
func (lb *Logbook) Backup(ctx context.Context, path string) (r Report, err error) {
	path, err = locate(path)
	if err != nil {
		return r, err
	}
	defer func() {
		if err != nil {
			err = fmt.Errorf("back up to %s: %w", path, err)
		}
	}()
	if _, err := os.Lstat(path); err == nil {
		return r, taken(path)
	}
	folder, err := os.MkdirTemp(filepath.Dir(path), ".ringbook-backup-*")
	if err != nil {
		return r, err
	}
	defer func() { err = errors.Join(err, os.RemoveAll(folder)) }()
	copied := filepath.Join(folder, "copy.db")
	if err := lb.copyTo(ctx, copied); err != nil {
		return r, err
	}
	if r, err = auditFile(ctx, copied); err != nil {
		return r, err
	}
	if err := syncFile(copied); err != nil {
		return r, err
	}
	// A link, unlike a rename, never takes the place of a file that has come there meanwhile.
	err = os.Link(copied, path)
	if errors.Is(err, fs.ErrExist) {
		return r, taken(path)
	}
	if err != nil { // a file system without links
		if _, there := os.Lstat(path); there == nil {
			return r, taken(path)
		}
		err = os.Rename(copied, path)
	}
	return r, errors.Join(err, syncFolder(filepath.Dir(path)))
}

func taken(path string) error {
	return fmt.Errorf("%s: %w; a backup never takes another's place: name a new file", filepath.Base(path), fs.ErrExist)
}

// copyTo makes a copy of the logbook as it stands at one moment, by one read that no writer waits for. Path must not exist.
func (lb *Logbook) copyTo(ctx context.Context, path string) error {
	conn, err := lb.db.Conn(ctx)
	if err != nil {
		return explain(lb.path, err)
	}
	defer conn.Close()
	var only int // on a connection that refuses to write, SQLite refuses to write the copy
	if err := conn.QueryRowContext(ctx, "PRAGMA query_only").Scan(&only); err != nil {
		return explain(lb.path, err)
	}
	if only != 0 {
		if _, err := conn.ExecContext(ctx, "PRAGMA query_only = 0"); err != nil {
			return explain(lb.path, err)
		}
		defer conn.ExecContext(context.WithoutCancel(ctx), "PRAGMA query_only = 1")
	}
	_, err = conn.ExecContext(ctx, "VACUUM INTO ?", path)
	return explain(lb.path, err)
}

func auditFile(ctx context.Context, path string) (Report, error) {
	lb, err := OpenReadOnly(ctx, path)
	if err != nil {
		return Report{}, err
	}
	r, err := lb.Audit(ctx, nil)
	return r, errors.Join(err, lb.Close())
}

func syncFile(path string) error {
	f, err := os.OpenFile(path, os.O_RDWR, 0)
	if err != nil {
		return err
	}
	return errors.Join(f.Sync(), f.Close())
}

// syncFolder puts a new name in a folder on the disk, where a folder can be opened for that.
func syncFolder(path string) error {
	if runtime.GOOS == "windows" {
		return nil
	}
	f, err := os.Open(path)
	if err != nil {
		return err
	}
	return errors.Join(f.Sync(), f.Close())
}
