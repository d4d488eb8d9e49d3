package store

import (
	"cmp"
	"context"
	"database/sql"
	"errors"
	"fmt"
	"iter"
	"math"
	"slices"

	"ringbook/snubber"
)

// Search streams the trials that a query asks for in the order it asks for, one at a time in memory, all from one state of
// the logbook. With a Limit it gives one page; the next begins After the last trial's id. After an error the sequence ends.
//
// A page in the order of time that is searched for by words costs no more in a long logbook than in a short one, as long as
// trials were logged more or less in the order they were read; where few match, it goes back as far as they are apart. Other
// orders look at every trial that matches.
func (lb *Logbook) Search(ctx context.Context, q Query) iter.Seq2[snubber.Trial, error] {
	return func(yield func(snubber.Trial, error) bool) {
		fail := func(err error) { yield(snubber.Trial{}, fmt.Errorf("search: %w", explain(lb.path, err))) }
		tx, err := lb.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
		if err != nil {
			fail(err)
			return
		}
		defer tx.Rollback() // it only read
		s, err := newSearch(ctx, tx, q)
		if err != nil {
			fail(err)
			return
		}
		if q.Limit == 0 && q.Sort == ByTime && len(s.words) == 0 {
			picked, args, order := s.all()
			lb.streamFrom(ctx, tx, picked, order, args, yield)
			return
		}
		for size := q.Limit; ; size = min(max(2*size, firstPage), maxPage) {
			if q.Limit == 0 { // a page at a time all the same: what SQLite would keep of a whole answer has no bound
				size = max(size, firstPage)
				s.Limit = size
			}
			page, err := s.page(ctx)
			if err != nil {
				fail(err)
				return
			}
			for part := range slices.Chunk(page, 1000) {
				if !lb.streamFrom(ctx, tx, "SELECT j.value AS seq, j.key AS at FROM json_each(?) j", "picked.at", []any{list(part)}, yield) {
					return
				}
			}
			if q.Limit > 0 || len(page) < s.Limit {
				return
			}
			if s.after, err = s.spotOf(ctx, "t.seq = ?", page[len(page)-1]); err != nil {
				fail(err)
				return
			}
		}
	}
}

// The pages of an answer without a Limit, in trials: the first, and the most.
const (
	firstPage = 256
	maxPage   = 1 << 14
)

// Count is how many trials a query asks for, whatever its Limit and After.
func (lb *Logbook) Count(ctx context.Context, q Query) (n int, err error) {
	fail := func(err error) (int, error) { return 0, fmt.Errorf("search: %w", explain(lb.path, err)) }
	tx, err := lb.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
	if err != nil {
		return fail(err)
	}
	defer tx.Rollback() // it only read
	q.After = ""
	s, err := newSearch(ctx, tx, q)
	if err != nil {
		return fail(err)
	}
	where, args := s.where(0, math.MaxInt64)
	if err := tx.QueryRowContext(ctx, "SELECT count(*) FROM trial t WHERE "+where, args...).Scan(&n); err != nil {
		return fail(err)
	}
	return n, nil
}

// search is a query in one state of a logbook.
type search struct {
	Query
	tx      *sql.Tx
	words   []*wanted
	indexed int64 // the last trial whose words are indexed
	after   *spot // where to begin; nil: at the beginning
}

// spot is a trial's place in the order: its key and its seq.
type spot struct {
	at  any
	seq int64
}

func newSearch(ctx context.Context, tx *sql.Tx, q Query) (*search, error) {
	if err := q.check(); err != nil {
		return nil, err
	}
	phrases, err := parseWords(q.Words)
	if err != nil {
		return nil, err
	}
	s := &search{Query: q, tx: tx}
	if q.After != "" {
		s.after, err = s.spotOf(ctx, "t.id = ?", q.After)
		if errors.Is(err, sql.ErrNoRows) {
			return nil, fmt.Errorf("begin after trial %s: %w in this logbook; give the whole id of the page's last trial", quote(q.After), ErrNoTrial)
		}
		if err != nil {
			return nil, err
		}
	}
	if len(phrases) == 0 {
		return s, nil
	}
	schema, err := schemaOf(ctx, tx)
	if err != nil {
		return nil, err
	}
	if schema < 4 {
		return nil, fmt.Errorf("the logbook's schema, %d, has no index of words; open it for writing once to make it, or search without words", schema)
	}
	if err := tx.QueryRowContext(ctx, selectIndexed).Scan(&s.indexed); err != nil {
		return nil, err
	}
	s.words, err = seek(ctx, tx, phrases, s.indexed)
	return s, err
}

func (s *search) spotOf(ctx context.Context, which string, is any) (*spot, error) {
	at := &spot{}
	err := s.tx.QueryRowContext(ctx, "SELECT t.seq, "+s.key()+" FROM trial t WHERE "+which, is).Scan(&at.seq, &at.at)
	return at, err
}

// where is everything asked of trial t among the rows first to last.
func (s *search) where(first, last int64) (string, []any) {
	where, args := s.condition()
	add := func(condition string, values ...any) {
		where, args = where+" AND "+condition, append(args, values...)
	}
	if first > 0 {
		add("t.seq BETWEEN ? AND ?", first, last)
	}
	for _, w := range s.words {
		condition, values := w.condition(first, last, s.readings())
		add(condition, values...)
	}
	if s.after == nil {
		return where, args
	}
	than := ">"
	if s.Descending {
		than = "<"
	}
	switch key := s.key(); {
	case s.Sort == ByTime:
		add("(t.at, t.seq) "+than+" (?, ?)", s.after.at, s.after.seq)
	case s.after.at == nil:
		add("("+key+" IS NULL AND t.seq "+than+" ?)", s.after.seq)
	default:
		add("("+key+" IS NULL OR ("+key+", t.seq) "+than+" (?, ?))", s.after.at, s.after.seq)
	}
	return where, args
}

// all is the whole answer as a table (seq, at) to select from, at being the key, and its order.
func (s *search) all() (picked string, args []any, order string) {
	where, args := s.where(0, math.MaxInt64)
	return "SELECT t.seq AS seq, " + s.key() + " AS at FROM trial t WHERE " + where, args, s.order("picked")
}

// page is the first Limit trials of the answer.
func (s *search) page(ctx context.Context) ([]int64, error) {
	if s.Sort == ByTime && len(s.words) > 0 {
		return s.pageByStretches(ctx)
	}
	where, args := s.where(0, math.MaxInt64)
	query := "SELECT seq FROM (SELECT t.seq AS seq, " + s.key() + " AS at FROM trial t WHERE " + where + ") p ORDER BY " + s.order("p") + " LIMIT ?"
	return numbers(ctx, s.tx, query, append(args, s.Limit)...)
}

// reach is a run of trials in the order of logging, with the bounds of their times.
type reach struct {
	first, last    int64
	oldest, newest string
}

// pageByStretches goes through the stretches of the index from the end of time that the page begins at, and stops where no
// other can have a trial that belongs on it.
func (s *search) pageByStretches(ctx context.Context) ([]int64, error) {
	reaches, err := s.reaches(ctx)
	if err != nil {
		return nil, err
	}
	var page []timed
	for n := 1; len(reaches) > 0; n *= 2 { // more each time: few trials match
		next := reaches[:min(n, len(reaches))]
		reaches = reaches[len(next):]
		for _, run := range runs(next) {
			if page, err = s.merge(ctx, page, run); err != nil {
				return nil, err
			}
		}
		if len(page) == s.Limit && len(reaches) > 0 && !s.before(reaches[0].best(s.Descending), page[len(page)-1]) {
			break
		}
	}
	seqs := make([]int64, len(page))
	for i, t := range page {
		seqs[i] = t.seq
	}
	return seqs, nil
}

// timed is a trial's place in time.
type timed struct {
	at  string
	seq int64
}

func (s *search) compare(a, b timed) int {
	order := cmp.Or(cmp.Compare(a.at, b.at), cmp.Compare(a.seq, b.seq))
	if s.Descending {
		return -order
	}
	return order
}

func (s *search) before(a, b timed) bool { return s.compare(a, b) < 0 }

// best is the place of the first trial that r may have.
func (r reach) best(descending bool) timed {
	if descending {
		return timed{r.newest, r.last}
	}
	return timed{r.oldest, r.first}
}

// merge adds to page what belongs on it of the trials in r.
func (s *search) merge(ctx context.Context, page []timed, r reach) ([]timed, error) {
	where, args := s.where(r.first, r.last)
	rows, err := s.tx.QueryContext(ctx, "SELECT t.at, t.seq FROM trial t WHERE "+where+" ORDER BY "+s.order("t")+" LIMIT ?", append(args, s.Limit)...)
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	for rows.Next() {
		var t timed
		if err := rows.Scan(&t.at, &t.seq); err != nil {
			return nil, err
		}
		page = append(page, t)
	}
	slices.SortFunc(page, s.compare)
	return page[:min(len(page), s.Limit)], rows.Err()
}

// reaches are the stretches, and the trials after them, that can have trials on the page, in the order of their best.
func (s *search) reaches(ctx context.Context) ([]reach, error) {
	rows, err := s.tx.QueryContext(ctx, `SELECT last, oldest, newest FROM stretch
UNION ALL SELECT max(seq), min(at), max(at) FROM trial WHERE seq > ? HAVING count(*) > 0 ORDER BY 1`, s.indexed)
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	var all []reach
	next := int64(1)
	for rows.Next() {
		r := reach{first: next}
		if err := rows.Scan(&r.last, &r.oldest, &r.newest); err != nil {
			return nil, err
		}
		next = r.last + 1
		if s.mayHave(r) {
			all = append(all, r)
		}
	}
	slices.SortFunc(all, func(a, b reach) int { return s.compare(a.best(s.Descending), b.best(s.Descending)) })
	return all, rows.Err()
}

// mayHave is whether the times of r and those asked for meet.
func (s *search) mayHave(r reach) bool {
	if !s.Since.IsZero() && r.newest < timeText(s.Since) || !s.Until.IsZero() && r.oldest >= timeText(s.Until) {
		return false
	}
	if s.after == nil {
		return true
	}
	at, _ := s.after.at.(string)
	if s.Descending {
		return r.oldest <= at
	}
	return r.newest >= at
}

// runs are the reaches as few as they can be: neighbours in the order of logging are one.
func runs(reaches []reach) []reach {
	sorted := slices.SortedFunc(slices.Values(reaches), func(a, b reach) int { return cmp.Compare(a.first, b.first) })
	all := sorted[:1]
	for _, r := range sorted[1:] {
		if end := &all[len(all)-1]; r.first == end.last+1 {
			end.last = r.last
		} else {
			all = append(all, r)
		}
	}
	return all
}
