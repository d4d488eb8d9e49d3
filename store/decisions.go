package store

import (
	"context"
	"database/sql"
	"fmt"
	"iter"
	"strings"
	"time"

	"ringbook/snubber"
)

// Decisions streams the decisions of the scope's board and revision that were made in its time, in that order, all from
// one state of the logbook. Limit counts decisions; IncludeStruck has no meaning for them. After an error the sequence ends.
//
// A logbook of schema 1 that is open for reading alone has none.
func (lb *Logbook) Decisions(ctx context.Context, s Scope) iter.Seq2[Decision, error] {
	s.IncludeStruck = true
	where, args := s.where()
	picked := "SELECT t.seq AS seq, t.at AS at FROM decision t WHERE " + where
	if s.Limit > 0 {
		picked += " ORDER BY t.at DESC, t.seq DESC LIMIT ?"
		args = append(args, s.Limit)
	}
	return lb.decisions(ctx, picked, args)
}

// Decision gives one decision by its id or by the last 6 or more characters of it. Errors are of kind ErrNoDecision where
// there is none.
func (lb *Logbook) Decision(ctx context.Context, id string) (Decision, error) {
	if schema, err := schemaOf(ctx, lb.db); err != nil {
		return Decision{}, explain(lb.path, err)
	} else if schema < 2 {
		return Decision{}, aDecision.none(id)
	}
	seq, _, err := aDecision.find(ctx, lb.db, id)
	if err != nil {
		return Decision{}, explain(lb.path, err)
	}
	for d, err := range lb.decisions(ctx, "SELECT seq, at FROM decision WHERE seq = ?", []any{seq}) {
		return d, err
	}
	return Decision{}, aDecision.none(id)
}

// DecisionTrials streams the trials that a decision, named by its whole id, rests on, struck or not, as Trials does.
func (lb *Logbook) DecisionTrials(ctx context.Context, id string) iter.Seq2[snubber.Trial, error] {
	return lb.stream(ctx, `SELECT t.seq AS seq, t.at AS at FROM decision d
  JOIN decision_trial x ON x.decision = d.seq JOIN trial t ON t.seq = x.trial WHERE d.id = ?`, []any{id})
}

func (lb *Logbook) decisions(ctx context.Context, picked string, args []any) iter.Seq2[Decision, error] {
	return func(yield func(Decision, error) bool) {
		fail := func(err error) { yield(Decision{}, fmt.Errorf("read decisions: %w", explain(lb.path, err))) }
		tx, err := lb.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
		if err != nil {
			fail(err)
			return
		}
		defer tx.Rollback() // it only read
		if schema, err := schemaOf(ctx, tx); err != nil {
			fail(err)
			return
		} else if schema < 2 {
			return
		}
		rows, err := tx.QueryContext(ctx, fmt.Sprintf(selectDecisions, picked, "picked.at, picked.seq"), args...)
		if err != nil {
			fail(err)
			return
		}
		defer rows.Close()
		for rows.Next() {
			d, _, err := scanDecision(rows)
			if err != nil {
				fail(err)
				return
			}
			if !yield(d, nil) {
				return
			}
		}
		if err := rows.Err(); err != nil {
			fail(err)
		}
	}
}

const selectDecisions = `
SELECT d.seq, d.id, b.name, v.name, d.at, d.network, d.c, ifnull(d.c_tol, 0), ifnull(d.r, 0), ifnull(d.r_tol, 0), d.limit_v,
  d.peak_v, ifnull(d.peak_v_u, 0), d.peak_v_low, d.peak_v_high, ifnull(d.damping_ratio, 0), ifnull(d.loss_w, 0),
  d.bus_v, d.excitation_a, ifnull(d.switching_hz, 0),
  d.inductance_h, d.capacitance_f, ifnull(d.resistance_ohm, 0), d.digest, d.recommendation,
  (SELECT group_concat(t.id, ' ' ORDER BY t.at, t.seq) FROM decision_trial x JOIN trial t ON t.seq = x.trial WHERE x.decision = d.seq)
FROM (%s) picked CROSS JOIN decision d ON d.seq = picked.seq
JOIN revision v ON v.id = d.revision JOIN board b ON b.id = v.board
ORDER BY %s`

func scanDecision(rows *sql.Rows) (d Decision, seq int64, err error) {
	var at string
	var whole, trials sql.NullString
	n := &d.Network
	err = rows.Scan(&seq, &d.ID, &d.Board, &d.Revision, &at, &n.Kind, &n.C, &n.CTol, &n.R, &n.RTol, &d.LimitV,
		&d.Peak.Value, &d.Peak.U, &d.Peak.Low, &d.Peak.High, &d.Damping, &d.LossW,
		&d.Excitation.Bus, &d.Excitation.Current, &d.SwitchingHz,
		&d.Loop.Inductance, &d.Loop.Capacitance, &d.Loop.Resistance, &d.Digest, &whole, &trials)
	if err != nil {
		return d, seq, err
	}
	if whole.Valid {
		d.Recommendation = []byte(whole.String)
	}
	d.Trials = strings.Fields(trials.String)
	if d.At, err = time.Parse(timeLayout, at); err != nil {
		return d, seq, fmt.Errorf("decision %s: its time %s is not one this logbook writes", d.ID, quote(at))
	}
	return d, seq, nil
}
