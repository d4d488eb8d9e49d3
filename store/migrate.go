package store

import (
	"context"
	"database/sql"
	"embed"
	"errors"
	"fmt"
	"io/fs"
	"sort"
)

// Migrations are NNNN_what.sql, numbered from 0001 without a gap. Add at the end; never edit one that was released.
//
//go:embed migrations/*.sql
var migrationFiles embed.FS

// migrations are the scripts in order: the n-th takes schema n-1 to schema n.
func migrations() ([]string, error) {
	names, err := fs.Glob(migrationFiles, "migrations/*.sql")
	if err != nil {
		return nil, err
	}
	sort.Strings(names)
	scripts := make([]string, len(names))
	for i, name := range names {
		var n int
		if _, err := fmt.Sscanf(name, "migrations/%04d_", &n); err != nil || n != i+1 {
			return nil, fmt.Errorf("%s: migration %d must be named %04d_what.sql", name, i+1, i+1)
		}
		text, err := migrationFiles.ReadFile(name)
		if err != nil {
			return nil, err
		}
		scripts[i] = string(text)
	}
	return scripts, nil
}

func latestVersion() (int, error) {
	names, err := fs.Glob(migrationFiles, "migrations/*.sql")
	return len(names), err
}

// schemaOf is the schema db has now: an older file that is open for reading alone stays what it was, until another
// program brings it up to date.
func schemaOf(ctx context.Context, db querier) (version int, err error) {
	rows, err := db.QueryContext(ctx, "PRAGMA user_version")
	if err != nil {
		return 0, err
	}
	defer rows.Close()
	for rows.Next() {
		if err := rows.Scan(&version); err != nil {
			return 0, err
		}
	}
	return version, rows.Err()
}

// migrate brings the schema up to date. Each migration is one transaction that also sets user_version, and the version
// is read again inside it: of two programs that open an old file at once, one migrates and the other finds it done.
func migrate(ctx context.Context, conn *sql.Conn, path string) error {
	scripts, err := migrations()
	if err != nil {
		return err
	}
	for {
		var id int32
		var version, tables int
		err := conn.QueryRowContext(ctx, "SELECT application_id, user_version, (SELECT count(*) FROM sqlite_schema) FROM pragma_application_id, pragma_user_version").
			Scan(&id, &version, &tables)
		if err != nil {
			return err
		}
		switch {
		case id != applicationID && (id != 0 || version != 0 || tables != 0):
			return stranger(path, uint32(id))
		case version == len(scripts):
			return nil
		case version > len(scripts):
			return newer(path, version, len(scripts))
		}
		if err := migrateOnce(ctx, conn, scripts); err != nil {
			return fmt.Errorf("bring schema %d to %d: %w", version, version+1, err)
		}
	}
}

func migrateOnce(ctx context.Context, conn *sql.Conn, scripts []string) (err error) {
	if _, err := conn.ExecContext(ctx, "BEGIN IMMEDIATE"); err != nil {
		return err
	}
	unhurried := context.WithoutCancel(ctx)
	defer func() {
		if err != nil {
			_, undo := conn.ExecContext(unhurried, "ROLLBACK")
			err = errors.Join(err, undo)
		}
	}()
	var version int
	if err := conn.QueryRowContext(ctx, "PRAGMA user_version").Scan(&version); err != nil {
		return err
	}
	if version < len(scripts) {
		if _, err := conn.ExecContext(ctx, scripts[version]); err != nil {
			return err
		}
		if err := finish(ctx, conn, version+1); err != nil {
			return err
		}
		stamp := fmt.Sprintf("PRAGMA application_id = %d; PRAGMA user_version = %d", applicationID, version+1)
		if _, err := conn.ExecContext(ctx, stamp); err != nil {
			return err
		}
	}
	_, err = conn.ExecContext(unhurried, "COMMIT")
	return err
}
