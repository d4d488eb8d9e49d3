package store

import (
	"context"
	"errors"
	"fmt"
	"slices"
)

// chunk looks at the entries first to last.
func (a *audit) chunk(ctx context.Context, r *entryReader, first, last int64) error {
	part, err := links(ctx, r.db, first, last)
	if err != nil {
		return err
	}
	previous, err := previousLink(ctx, r.db, a.end.logbook, first)
	if err != nil {
		return err
	}
	counts := map[string]int{}
	merged, at := 0, first
	loose := func(kind string, row loggedRow) {
		a.add(Damage{Kind: kind, ID: row.id(), Entry: at, What: "it is not in the chain: something else than ringbook wrote it"})
	}
	var text []byte
	err = r.walk(ctx, part, loose, func(c chained) error {
		if c.seq != at {
			a.add(Damage{Kind: c.linkRow.kind, Entry: at, What: fmt.Sprintf("it and all up to entry %d are missing from the chain", c.seq-1)})
		}
		at = c.seq + 1
		p := place{logbook: a.end.logbook, seq: c.seq, previous: previous}
		previous = c.link
		counts[c.linkRow.kind]++
		if c.entry == nil {
			a.add(Damage{Kind: c.linkRow.kind, Entry: c.seq, What: fmt.Sprintf("its row %d is missing", c.row)})
			return nil
		}
		d := Damage{Kind: c.linkRow.kind, ID: c.id(), Entry: c.seq}
		if c.fault != "" {
			d.What = c.fault
			a.add(d)
			return nil
		}
		text = c.text(text[:0])
		if p.seal(text, c.origin) != c.link {
			d.What = "it is not what was logged: its text and the link before it do not give its link"
			a.add(d)
		}
		if c.origin != nil {
			if merged++; c.origin.seal(text, nil) != c.origin.link {
				d.What = fmt.Sprintf("it is not what was logged as entry %d of logbook %s", c.origin.seq, c.origin.logbook)
				a.add(d)
			}
		}
		return nil
	})
	if err == nil && at <= last {
		a.add(Damage{Entry: at, What: fmt.Sprintf("it and all up to entry %d are missing from the chain", last)})
	}
	if err != nil && ctx.Err() == nil {
		// What was read up to here is judged; the entry at which the file cannot be read is named.
		a.add(Damage{Kind: "row", Entry: at, What: "it cannot be read"})
	}
	a.mu.Lock()
	defer a.mu.Unlock()
	a.r.Entries += counts[trialKind] + counts[strikeKind] + counts[decisionKind] + counts[correctionKind]
	a.r.Trials += counts[trialKind]
	a.r.Strikes += counts[strikeKind]
	a.r.Decisions += counts[decisionKind]
	a.r.Corrections += counts[correctionKind]
	a.r.Merged += merged
	a.spans = append(a.spans, spans(part)...)
	return err
}

// checkFile has SQLite look at its file.
func (a *audit) checkFile(ctx context.Context) error {
	err := a.ask(ctx, "PRAGMA integrity_check", func(scan func(...any) error) error {
		var what string
		if err := scan(&what); err != nil {
			return err
		}
		if what != "ok" {
			a.add(Damage{What: "the file: " + what})
		}
		return nil
	})
	if err := a.whole("the file", err); err != nil {
		return err
	}
	err = a.ask(ctx, "PRAGMA foreign_key_check", func(scan func(...any) error) error {
		var table, parent string
		var row, key any
		if err := scan(&table, &row, &parent, &key); err != nil {
			return err
		}
		what := fmt.Sprintf("a row of table %s names a %s that is not there", table, parent)
		if row != nil {
			what = fmt.Sprintf("row %v of table %s names a %s that is not there", row, table, parent)
		}
		a.add(Damage{What: what})
		return nil
	})
	if err := a.whole("the file's references", err); err != nil || a.r.Schema < 4 {
		return err
	}
	const bounds = `SELECT s.last FROM stretch s WHERE (s.oldest, s.newest) IS NOT (SELECT min(t.at), max(t.at) FROM trial t
  WHERE t.seq <= s.last AND t.seq > ifnull((SELECT max(p.last) FROM stretch p WHERE p.last < s.last), 0))`
	err = a.ask(ctx, bounds, func(scan func(...any) error) error {
		var last int64
		if err := scan(&last); err != nil {
			return err
		}
		a.add(Damage{What: fmt.Sprintf("the index of words has wrong times for the trials up to row %d; the trials themselves are not concerned", last)})
		return nil
	})
	return a.whole("the index of words", err)
}

// checkWhole looks for rows that the chain does not name between those of one chunk and the next and after the last, and at
// what stands of boards.
func (a *audit) checkWhole(ctx context.Context) error {
	for _, kind := range []string{trialKind, strikeKind, decisionKind, correctionKind} {
		var of []span
		for _, s := range a.spans {
			if s.kind == kind {
				of = append(of, s)
			}
		}
		slices.SortFunc(of, func(x, y span) int { return int(x.at - y.at) })
		next := int64(1)
		for _, s := range of {
			if s.first > next {
				if err := a.looseRows(ctx, kind, next, s.first-1, s.at); err != nil {
					return err
				}
			}
			if s.first < next {
				a.add(Damage{Kind: kind, Entry: s.at, What: fmt.Sprintf("its row %d comes again in the chain, or out of order", s.first)})
			}
			next = max(next, s.last+1)
		}
		if err := a.looseRows(ctx, kind, next, 1<<62, 0); err != nil {
			return err
		}
	}
	stated := []struct{ what, query string }{
		{"board", `SELECT b.name, '' FROM board b WHERE b.device_v IS NOT ` + statedVolts + ` OR b.note IS NOT ` + statedNote},
		{"revision", `SELECT b.name, v.name FROM revision v JOIN board b ON b.id = v.board WHERE v.note IS NOT ` + statedRevNote},
	}
	for _, s := range stated {
		err := a.ask(ctx, s.query, func(scan func(...any) error) error {
			var board, revision string
			if err := scan(&board, &revision); err != nil {
				return err
			}
			what := "board " + quote(board)
			if revision != "" {
				what += ", revision " + quote(revision)
			}
			a.add(Damage{What: what + ": its rating or note is not what was last stated of it"})
			return nil
		})
		if err := a.whole("the boards", err); err != nil {
			return err
		}
	}
	return nil
}

// looseRows notes rows first to last of a kind, none of which an audited entry names, unless a later entry does.
func (a *audit) looseRows(ctx context.Context, kind string, first, last, at int64) error {
	const query = `SELECT id FROM %[1]s WHERE seq BETWEEN %[2]d AND min(%[3]d, (SELECT ifnull(max(seq), 0) FROM %[1]s))
  AND seq NOT IN (SELECT row FROM chain WHERE kind = '%[1]s' AND seq > %[4]d) LIMIT 20`
	after := int64(0)
	if at == 0 {
		after = a.end.seq
	}
	err := a.ask(ctx, fmt.Sprintf(query, kind, first, last, after), func(scan func(...any) error) error {
		var id string
		if err := scan(&id); err != nil {
			return err
		}
		a.add(Damage{Kind: kind, ID: id, Entry: at, What: "it is not in the chain: something else than ringbook wrote it"})
		return nil
	})
	return a.whole("the rows of table "+kind, err)
}

// ask hands each row of query to do.
func (a *audit) ask(ctx context.Context, query string, do func(scan func(...any) error) error) error {
	rows, err := a.lb.db.QueryContext(ctx, query)
	if err != nil {
		return err
	}
	defer rows.Close()
	for rows.Next() {
		if err := do(rows.Scan); err != nil {
			return err
		}
	}
	return errors.Join(rows.Err(), rows.Close())
}
