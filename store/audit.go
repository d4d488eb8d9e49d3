package store

import (
	"cmp"
	"context"
	"encoding/hex"
	"errors"
	"fmt"
	"runtime"
	"slices"
	"sync"

	"modernc.org/sqlite"
	sqlite3 "modernc.org/sqlite/lib"
)

// Report is what an audit found.
type Report struct {
	Logbook string // the id of the logbook; "" where its schema has none
	Schema  int
	Head    string // the link of the last entry, in hexadecimal: noted elsewhere, it shows a logbook that was cut short

	Entries, Trials, Strikes, Decisions, Corrections int // in the chain
	Merged                                           int // of these, how many came from other logbooks

	Damage  []Damage // what is wrong: the first entry of the chain that differs first; mostDamage of them
	More    int      // how much more is wrong
	Warning string   // why not all was looked at, as in a logbook of an older schema; "" where all was
}

// Damage is one thing that is wrong.
type Damage struct {
	Kind  string // trial, strike, decision, correction; "" for the file as a whole
	ID    string // the row's; "" where it has none or none that can be read
	Entry int64  // its place in the chain, from 1; 0 where it has none
	What  string
}

const mostDamage = 20

// Sound says that nothing is wrong.
func (r *Report) Sound() bool { return len(r.Damage) == 0 }

func (d Damage) String() string {
	switch {
	case d.Entry > 0 && d.ID != "":
		return fmt.Sprintf("entry %d, %s %s: %s", d.Entry, d.Kind, d.ID, d.What)
	case d.Entry > 0:
		return fmt.Sprintf("entry %d, a %s: %s", d.Entry, d.Kind, d.What)
	case d.ID != "":
		return fmt.Sprintf("%s %s: %s", d.Kind, d.ID, d.What)
	}
	return d.What
}

// auditChunk is how many entries are looked at between two looks at the context and the progress.
const auditChunk = 4096

// Audit looks at everything: SQLite's own integrity check and foreign keys; the text of each trial, strike, decision and
// correction, with its readings and waveforms, against its link in the chain; each merged entry against its place in the
// chain it came from; that every row is in the chain; that each board has the rating and note last stated; and the bounds
// by which the index of words is searched. Other programs may write meanwhile: what they log is not looked at.
//
// What is wrong is in the Report; an error means that there is none. progress, unless nil, is told how many entries of all have
// been looked at.
func (lb *Logbook) Audit(ctx context.Context, progress func(done, all int64)) (Report, error) {
	a := &audit{lb: lb, progress: progress}
	if err := a.run(ctx); err != nil {
		return Report{}, fmt.Errorf("audit: %w", explain(lb.path, err))
	}
	return a.report(), nil
}

type audit struct {
	lb       *Logbook
	progress func(done, all int64)
	end      place // the chain's as the audit begins

	mu     sync.Mutex
	r      Report
	damage []Damage
	more   int
	done   int64
	spans  []span
}

// add notes damage; the kept ones are cut to the first in the end.
func (a *audit) add(d Damage) {
	a.mu.Lock()
	defer a.mu.Unlock()
	const room = 50 * mostDamage
	a.damage = append(a.damage, d)
	if len(a.damage) >= room {
		a.sort()
		a.more += len(a.damage) - room/2
		a.damage = a.damage[:room/2]
	}
}

func (a *audit) sort() {
	slices.SortStableFunc(a.damage, func(x, y Damage) int {
		place := func(d Damage) uint64 { return uint64(d.Entry) - 1 } // those without a place come last
		return cmp.Compare(place(x), place(y))
	})
}

func (a *audit) report() Report {
	a.sort()
	n := min(len(a.damage), mostDamage)
	a.r.Damage, a.r.More = a.damage[:n:n], a.more+len(a.damage)-n
	return a.r
}

// whole notes an error that damage to the file explains; any other comes back.
func (a *audit) whole(what string, err error) error {
	var lite *sqlite.Error
	var fault *Fault
	switch {
	case err == nil:
		return nil
	case errors.As(err, &fault) && fault.Kind == ErrDamaged:
		a.add(Damage{What: what + ": " + fault.What})
	case errors.Is(err, ErrDamaged):
		a.add(Damage{What: what + ": " + err.Error()})
	case errors.As(err, &lite) && damaging(lite):
		a.add(Damage{What: what + ": " + plain(lite)})
	case errors.As(err, &lite), errors.Is(err, context.Canceled), errors.Is(err, context.DeadlineExceeded):
		return err
	default: // a value that is not of the kind the column holds
		a.add(Damage{What: what + ": " + err.Error()})
	}
	return nil
}

// damaging is whether SQLite's error means that what is in the file is wrong.
func damaging(err *sqlite.Error) bool {
	switch err.Code() & 0xff {
	case sqlite3.SQLITE_CORRUPT, sqlite3.SQLITE_NOTADB, sqlite3.SQLITE_ERROR, sqlite3.SQLITE_MISMATCH, sqlite3.SQLITE_TOOBIG:
		return true
	case sqlite3.SQLITE_IOERR:
		return err.Code() == sqlite3.SQLITE_IOERR_SHORT_READ || err.Code() == sqlite3.SQLITE_IOERR_DATA || err.Code() == sqlite3.SQLITE_IOERR_CORRUPTFS
	}
	return false
}

func (a *audit) run(ctx context.Context) error {
	var err error
	if a.r.Schema, err = schemaOf(ctx, a.lb.db); err != nil {
		return a.whole("the schema", err)
	}
	group := &group{}
	ctx, cancel := context.WithCancel(ctx)
	defer cancel()
	group.cancel = cancel
	group.run(func() error { return a.checkFile(ctx) })
	if a.r.Schema < 4 {
		a.r.Warning = fmt.Sprintf("its schema, %d, chains no entries; open it for writing once to chain them", a.r.Schema)
		return group.wait()
	}
	if a.end, err = lastPlace(ctx, a.lb.db); err != nil {
		return errors.Join(a.whole("the end of the chain", err), group.wait())
	}
	a.r.Logbook, a.r.Head = a.end.logbook, hex.EncodeToString(a.end.link[:])
	chunks := make(chan int64)
	group.run(func() error {
		defer close(chunks)
		for first := int64(1); first <= a.end.seq; first += auditChunk {
			select {
			case chunks <- first:
			case <-ctx.Done():
				return ctx.Err()
			}
		}
		return nil
	})
	for range min(runtime.GOMAXPROCS(0), 4) {
		group.run(func() error { return a.work(ctx, chunks) })
	}
	if err := group.wait(); err != nil {
		return err
	}
	return a.checkWhole(ctx)
}

// work audits chunks until there are no more.
func (a *audit) work(ctx context.Context, chunks <-chan int64) error {
	conn, err := a.lb.db.Conn(ctx)
	if err != nil {
		return err
	}
	defer conn.Close()
	r := newEntryReader(conn)
	for first := range chunks {
		last := min(first+auditChunk-1, a.end.seq)
		if err := a.whole(fmt.Sprintf("entries %d to %d", first, last), a.chunk(ctx, r, first, last)); err != nil {
			return err
		}
		if err := ctx.Err(); err != nil {
			return err
		}
		a.mu.Lock()
		a.done += last - first + 1
		if a.progress != nil {
			a.progress(a.done, a.end.seq)
		}
		a.mu.Unlock()
	}
	return nil
}

// group runs functions side by side; the first error ends them all.
type group struct {
	all    sync.WaitGroup
	once   sync.Once
	err    error
	cancel context.CancelFunc
}

func (g *group) run(do func() error) {
	g.all.Go(func() {
		if err := do(); err != nil {
			g.once.Do(func() { g.err = err })
			g.cancel()
		}
	})
}

func (g *group) wait() error {
	g.all.Wait()
	return g.err
}
