package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"strings"

	"ringbook/snubber"
)

// The same order as selectTrials: the cursors are merged by the trial's seq.
const (
	fromWaveform   = `ifnull(r.from_waveform, 0)` // since schema 3
	selectReadings = `
SELECT r.trial, r.quantity, r.value, ifnull(r.u, 0), ifnull(i.idn, ''), ` + fromWaveform + `
FROM (%s) picked CROSS JOIN reading r ON r.trial = picked.seq LEFT JOIN instrument i ON i.id = r.instrument
ORDER BY %s, r.quantity`
	selectRepeats = `
SELECT r.trial, r.quantity, r.value
FROM (%s) picked CROSS JOIN reading_repeat r ON r.trial = picked.seq
ORDER BY %s, r.quantity, r.n`
)

// readings are the cursors over the readings and their repeats, each one row ahead.
type readings struct {
	values, repeats *cursor[snubber.Reading]
}

func openReadings(ctx context.Context, tx *sql.Tx, picked, order string, args []any) (*readings, error) {
	query := selectReadings
	if schema, err := schemaOf(ctx, tx); err != nil {
		return nil, err
	} else if schema < 3 {
		query = strings.Replace(query, fromWaveform, "0", 1)
	}
	values, err := openCursor(ctx, tx, fmt.Sprintf(query, picked, order), args, func(rows *sql.Rows, seq *int64, r *snubber.Reading) error {
		return rows.Scan(seq, &r.Quantity, &r.Value, &r.U, &r.Instrument, &r.FromWaveform)
	})
	if err != nil {
		return nil, err
	}
	repeats, err := openCursor(ctx, tx, fmt.Sprintf(selectRepeats, picked, order), args, func(rows *sql.Rows, seq *int64, r *snubber.Reading) error {
		return rows.Scan(seq, &r.Quantity, &r.Value)
	})
	if err != nil {
		return nil, errors.Join(err, values.rows.Close())
	}
	return &readings{values, repeats}, nil
}

func (c *readings) close() {
	c.values.rows.Close()
	c.repeats.rows.Close()
}

// of gives the readings of trial seq; to be asked for each trial in turn.
func (c *readings) of(seq int64) ([]snubber.Reading, error) {
	var all []snubber.Reading
	for c.values.at(seq) {
		r := c.values.next
		if err := c.values.advance(); err != nil {
			return nil, err
		}
		for c.repeats.at(seq) && c.repeats.next.Quantity == r.Quantity {
			r.Repeats = append(r.Repeats, c.repeats.next.Value)
			if err := c.repeats.advance(); err != nil {
				return nil, err
			}
		}
		all = append(all, r)
	}
	inOrder(all)
	return all, nil
}

// cursor is a query's rows with the next row held in hand.
type cursor[T any] struct {
	rows *sql.Rows
	scan func(*sql.Rows, *int64, *T) error
	seq  int64 // the next row's trial
	next T
	done bool
}

func openCursor[T any](ctx context.Context, db querier, query string, args []any, scan func(*sql.Rows, *int64, *T) error) (*cursor[T], error) {
	rows, err := db.QueryContext(ctx, query, args...)
	if err != nil {
		return nil, err
	}
	c := &cursor[T]{rows: rows, scan: scan}
	if err := c.advance(); err != nil {
		return nil, errors.Join(err, rows.Close())
	}
	return c, nil
}

func (c *cursor[T]) at(seq int64) bool { return !c.done && c.seq == seq }

func (c *cursor[T]) advance() error {
	if !c.rows.Next() {
		c.done = true
		return c.rows.Err()
	}
	var fresh T
	c.next = fresh
	return c.scan(c.rows, &c.seq, &c.next)
}
