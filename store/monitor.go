package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"sync"
)

// Monitor tells whether anything was written to a logbook since it was last asked: by this program or another, on any
// connection but its own. It asks SQLite for its data version, which costs microseconds, and reads no row. It may be used by
// several goroutines, and is closed before its Logbook.
//
// A logbook on a write-protected disk is read as a file that never changes, and seems so here too.
type Monitor struct {
	path string
	file os.FileInfo

	mu   sync.Mutex
	conn *sql.Conn
	last int64
}

// Monitor begins to look for changes.
func (lb *Logbook) Monitor(ctx context.Context) (*Monitor, error) {
	file, err := os.Stat(lb.path)
	if err != nil {
		return nil, explain(lb.path, err)
	}
	conn, err := lb.db.Conn(ctx)
	if err != nil {
		return nil, explain(lb.path, err)
	}
	m := &Monitor{path: lb.path, file: file, conn: conn}
	if _, err := m.Changed(ctx); err != nil {
		return nil, errors.Join(err, conn.Close())
	}
	return m, nil
}

// Changed says whether anything was written since it was last asked, or since the Monitor was made. It may be wrongly true,
// as when another program that closes the logbook tidies its file, and is never wrongly false. Where another file has taken
// the logbook's place it fails with ErrMissing: what is read through this Logbook is then no longer what stands there.
func (m *Monitor) Changed(ctx context.Context) (bool, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	if now, err := os.Stat(m.path); err != nil || !os.SameFile(m.file, now) {
		return false, &Fault{Path: m.path, Kind: ErrMissing, What: "it was moved, deleted or replaced while it was open", Cure: "open it again"}
	}
	// https://sqlite.org/pragma.html#pragma_data_version: the value differs from the one before on the same connection
	// where another connection has committed in between.
	var version int64
	if err := m.conn.QueryRowContext(ctx, "PRAGMA data_version").Scan(&version); err != nil {
		return false, fmt.Errorf("look for changes: %w", explain(m.path, err))
	}
	changed := version != m.last
	m.last = version
	return changed, nil
}

// Close ends the looking.
func (m *Monitor) Close() error {
	if err := m.conn.Close(); err != nil && !errors.Is(err, sql.ErrConnDone) {
		return explain(m.path, err)
	}
	return nil
}
