package store

import (
	"context"
	"fmt"
)

// The words of trials go into their index a stretch at a time: each trial alone would cost as much again as logging it.
// A search reads the few trials since the last stretch as they are.
const (
	stretchTrials = 256     // logged one at a time, by any number of programs
	bulkTrials    = 4096    // in one transaction
	stretchBytes  = 1 << 20 // of their text
)

const (
	selectIndexed = `SELECT ifnull(max(last), 0) FROM stretch`
	insertWords   = `INSERT INTO trial_word (rowid, part, note)
  SELECT seq, part, note FROM trial WHERE seq > ? AND seq <= ? AND (part IS NOT NULL OR note IS NOT NULL) ORDER BY seq`
	insertStretch = `INSERT INTO stretch (last, oldest, newest) SELECT ?, min(at), max(at) FROM trial WHERE seq > ? AND seq <= ?`
)

// index is told of each trial logged, its seq and how many bytes of words it has, and closes a stretch where one is long enough.
func (w *writer) index(ctx context.Context, seq int64, bytes int) error {
	w.loose += bytes
	w.logged++
	w.trial = seq
	enough := int64(stretchTrials)
	if w.logged > stretchTrials {
		enough = bulkTrials
	}
	if seq-w.indexed < enough && w.loose < stretchBytes {
		return nil
	}
	s, err := w.stmt(ctx, selectIndexed)
	if err != nil {
		return err
	}
	if err := s.QueryRowContext(ctx).Scan(&w.indexed); err != nil {
		return err
	}
	if seq-w.indexed < enough && w.loose < stretchBytes {
		return nil // another program, or this one before, closed a stretch
	}
	return w.closeStretch(ctx, seq)
}

// closeStretch puts the words of all trials up to last into the index.
func (w *writer) closeStretch(ctx context.Context, last int64) error {
	if _, err := w.insert(ctx, insertWords, w.indexed, last); err != nil {
		return fmt.Errorf("index the words: %w", err)
	}
	if _, err := w.insert(ctx, insertStretch, last, w.indexed, last); err != nil {
		return fmt.Errorf("index the words: %w", err)
	}
	w.indexed, w.loose = last, 0
	return nil
}

// endStretch closes a stretch that a long transaction leaves open.
func (w *writer) endStretch(ctx context.Context) error {
	if w.logged < stretchTrials || w.trial-w.indexed < stretchTrials {
		return nil
	}
	return w.closeStretch(ctx, w.trial)
}
