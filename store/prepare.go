package store

import (
	"context"
	"database/sql"
	"errors"
	"time"

	"modernc.org/sqlite"
)

// prepareFile makes or updates the schema, and hands out the connection that writes.
func prepareFile(ctx context.Context, lb *Logbook) (_ *writer, err error) {
	conn, err := lb.db.Conn(ctx)
	if err != nil {
		return nil, err
	}
	defer func() {
		if err != nil {
			err = errors.Join(err, conn.Close())
		}
	}()
	if err := refuseReadOnly(conn, lb.path); err != nil {
		return nil, err
	}
	// The schema goes in before the write-ahead log is turned on: so application_id and user_version stand in the file
	// itself from its first write, where inspect looks for them.
	if err := migrate(ctx, conn, lb.path); err != nil {
		return nil, err
	}
	if err := useLog(ctx, conn, lb.path); err != nil {
		return nil, err
	}
	// The triggers make SQLite keep each row's old page until the statement is through: in memory, on this connection,
	// which sorts nothing large.
	if _, err := conn.ExecContext(ctx, "PRAGMA temp_store = MEMORY"); err != nil {
		return nil, err
	}
	// In KiB: a bulk import spills beyond it, and stays in bounds.
	if _, err := conn.ExecContext(ctx, "PRAGMA cache_size = -16384"); err != nil {
		return nil, err
	}
	// The writer waits for its turn by itself (writer.begin).
	if _, err := conn.ExecContext(ctx, "PRAGMA busy_timeout = 0"); err != nil {
		return nil, err
	}
	return newWriter(conn), nil
}

func refuseReadOnly(conn *sql.Conn, path string) error {
	return conn.Raw(func(c any) error {
		asker, ok := c.(interface{ IsReadOnly(string) (bool, error) })
		if !ok {
			return nil // the first write will tell
		}
		if no, err := asker.IsReadOnly("main"); err != nil || !no {
			return err
		}
		return &Fault{Path: path, Kind: ErrReadOnly, What: "the file is read-only",
			Cure: "make it and its folder writable, or copy it to a folder that is"}
	})
}

// useLog turns the write-ahead log on. SQLite does not wait its turn for this, so it is asked again until it has it.
func useLog(ctx context.Context, conn *sql.Conn, path string) error {
	deadline := time.Now().Add(busyWait)
	for {
		var mode string
		err := conn.QueryRowContext(ctx, "PRAGMA journal_mode = WAL").Scan(&mode)
		var lite *sqlite.Error
		switch {
		case err == nil && mode == "wal":
			return nil
		case err == nil:
			return &Fault{Path: path, What: "its file system cannot keep a write-ahead log (journal mode stays " + mode + ")",
				Cure: "keep the logbook on a disk of this computer"}
		case !errors.As(err, &lite) || !isBusy(lite) || time.Now().After(deadline):
			return err
		}
		select {
		case <-ctx.Done():
			return ctx.Err()
		case <-time.After(10 * time.Millisecond):
		}
	}
}
