package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"math/rand/v2"
	"time"

	"modernc.org/sqlite"
)

// writer is the one connection of a Logbook that writes, with its statements prepared once and the row numbers of the
// names it met lately.
type writer struct {
	conn     *sql.Conn
	prepared map[string]*sql.Stmt
	boards   map[string]int64
	revs     map[revisionKey]int64
	sessions map[string]int64
	devices  map[string]int64 // instruments by their *IDN? answer
	points   map[pointKey]int64
	logbooks map[string]int64
	last     place // the chain's end as this connection left it; no logbook: not known
	chained  int   // rows of the chain written in this transaction
	links    []any // those not written yet, and those of origin: values for insertChain and insertOrigin
	origins  []any
	text     []byte // room for an entry's text
	args     []any  // room for a statement's

	indexed int64 // the last trial of the last stretch, as far as is known
	loose   int   // bytes of text of the trials logged since
	logged  int   // trials logged in this transaction
	trial   int64 // the last of them
}

// cacheLimit bounds each map of a writer: an import may name a million operating points.
const cacheLimit = 10_000

func newWriter(conn *sql.Conn) *writer {
	w := &writer{conn: conn, prepared: map[string]*sql.Stmt{}}
	w.forget()
	return w
}

// forget drops the row numbers and what else is remembered: some may be of rows that were rolled back.
func (w *writer) forget() {
	w.boards, w.sessions, w.devices = map[string]int64{}, map[string]int64{}, map[string]int64{}
	w.revs, w.points, w.logbooks = map[revisionKey]int64{}, map[pointKey]int64{}, map[string]int64{}
	w.last, w.links, w.origins, w.indexed, w.loose = place{}, nil, nil, 0, 0
}

func (w *writer) close() error { return errors.Join(w.closeStatements(), w.conn.Close()) }

func (w *writer) closeStatements() error {
	var errs []error
	for _, stmt := range w.prepared {
		errs = append(errs, stmt.Close())
	}
	return errors.Join(errs...)
}

// write runs do in one transaction. When it returns nil all of it is on the disk; otherwise nothing is.
func (lb *Logbook) write(ctx context.Context, do func(*writer) error) (err error) {
	if lb.turn == nil {
		return &Fault{Path: lb.path, Kind: ErrReadOnly, What: "it was opened for reading alone", Cure: "open it for writing"}
	}
	var w *writer
	select {
	case w = <-lb.turn:
	case <-ctx.Done():
		return ctx.Err()
	}
	if w == nil {
		return fmt.Errorf("logbook %s: it was closed; open it again", lb.path)
	}
	defer func() { lb.turn <- w }()

	w.logged, w.chained = 0, 0
	if err := w.begin(ctx, lb.wait); err != nil {
		return explain(lb.path, err)
	}
	// A commit cut short by ctx would leave it open whether the trial is kept, so it is always seen through.
	unhurried := context.WithoutCancel(ctx)
	defer func() {
		if p := recover(); p != nil {
			w.undo(unhurried)
			panic(p)
		}
		if err != nil {
			w.undo(unhurried)
			err = explain(lb.path, err)
		}
	}()
	if err := do(w); err != nil {
		return err
	}
	if err := w.finish(unhurried); err != nil {
		return err
	}
	if err := ctx.Err(); err != nil {
		return err
	}
	commit, err := w.stmt(unhurried, "COMMIT")
	if err != nil {
		return err
	}
	_, err = commit.ExecContext(unhurried)
	return err
}

// finish writes what was put off to the end of a transaction.
func (w *writer) finish(ctx context.Context) error {
	if err := w.flushChain(ctx); err != nil {
		return err
	}
	return w.endStretch(ctx)
}

// begin takes the write lock at once: one asked for halfway through a transaction could not be waited for. The wait is here
// rather than in SQLite's busy_timeout, which on this connection is none, so that ctx is looked at between the tries and
// need not be watched in each.
func (w *writer) begin(ctx context.Context, wait time.Duration) error {
	s, err := w.stmt(ctx, "BEGIN IMMEDIATE")
	if err != nil {
		return err
	}
	unhurried := context.WithoutCancel(ctx)
	deadline := time.Now().Add(wait)
	for pause := time.Millisecond; ; pause = min(2*pause, 20*time.Millisecond) {
		_, err := s.ExecContext(unhurried)
		var lite *sqlite.Error
		if err == nil || !errors.As(err, &lite) || !isBusy(lite) || time.Now().After(deadline) {
			return err
		}
		select {
		case <-ctx.Done():
			return ctx.Err()
		case <-time.After(pause/2 + rand.N(pause)): // apart from the others that wait
		}
	}
}

// undo rolls back. Where SQLite has already done so by itself (disk full, damage), ROLLBACK has nothing to do and says
// so; either way the transaction is over.
func (w *writer) undo(ctx context.Context) {
	_, _ = w.conn.ExecContext(ctx, "ROLLBACK")
	w.forget()
}

// stmt prepares query on first use.
func (w *writer) stmt(ctx context.Context, query string) (*sql.Stmt, error) {
	if s, ok := w.prepared[query]; ok {
		return s, nil
	}
	s, err := w.conn.PrepareContext(ctx, query)
	if err != nil {
		return nil, err
	}
	w.prepared[query] = s
	return s, nil
}

// insert runs an INSERT and gives the new row's number.
func (w *writer) insert(ctx context.Context, query string, args ...any) (int64, error) {
	s, err := w.stmt(ctx, query)
	if err != nil {
		return 0, err
	}
	result, err := s.ExecContext(ctx, args...)
	if err != nil {
		return 0, err
	}
	return result.LastInsertId()
}

// number is the row number of what key names: remembered, found, or made new.
func number[K comparable](ctx context.Context, w *writer, known map[K]int64, key K, find, make string, args ...any) (int64, error) {
	if id, ok := known[key]; ok {
		return id, nil
	}
	s, err := w.stmt(ctx, find)
	if err != nil {
		return 0, err
	}
	var id int64
	err = s.QueryRowContext(ctx, args...).Scan(&id)
	if errors.Is(err, sql.ErrNoRows) {
		id, err = w.insert(ctx, make, args...)
	}
	if err != nil {
		return 0, err
	}
	if len(known) >= cacheLimit {
		clear(known)
	}
	known[key] = id
	return id, nil
}
