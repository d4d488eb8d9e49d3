package store

import (
	"context"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"math"
	"time"

	"ringbook/snubber"
)

// Decision is a recommendation as it was logged: the network, what was predicted of it, for which loop and operating
// point, and the trials all of it rests on. What is measured later is held against it.
type Decision struct {
	ID       string // UUIDv7 in its 36-character text form; "" until the logbook gives one
	Board    string
	Revision string
	At       time.Time        // when it was made; zero: when it is logged
	Network  snubber.Network  // kind, C, CTol, R, RTol; the rest is not kept
	LimitV   float64          // V, > 0: the peak it is to stay under
	Peak     snubber.Estimate // V: the peak predicted
	Damping  float64          // damping ratio of the least damped pair; 0: not stated
	LossW    float64          // W; 0: not stated

	// The operating point it was made for.
	Excitation  snubber.Excitation // bus > 0, loop current >= 0
	SwitchingHz float64            // Hz; 0: not stated

	Loop   snubber.Loop // the loop it was made for; resistance 0: not known
	Trials []string     // ids of the trials it rests on, by time; one at least
	Digest string       // TrialsDigest of these trials as they were

	Recommendation json.RawMessage // the whole answer; nil: not kept
}

const (
	insertDecision = `INSERT INTO decision (id, revision, at, network, c, c_tol, r, r_tol, limit_v,
  peak_v, peak_v_u, peak_v_low, peak_v_high, damping_ratio, loss_w, bus_v, excitation_a, switching_hz,
  inductance_h, capacitance_f, resistance_ohm, digest, recommendation)
  VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`
	insertDecisionTrial = `INSERT INTO decision_trial (decision, trial) SELECT ?, seq FROM trial WHERE id = ? AND revision = ?`
)

// AddDecision logs one decision and gives it its id, a UUID version 7. When it returns, the decision is on the disk.
//
// Its trials must be in the logbook, of the decision's own revision; errors are of kind ErrNoTrial where one is not. It
// must not have an id: one that has is in a logbook already.
func (lb *Logbook) AddDecision(ctx context.Context, d Decision) (id string, err error) {
	if err := checkDecision(d); err != nil {
		return "", fmt.Errorf("log the decision: %w", err)
	}
	err = lb.write(ctx, func(w *writer) error {
		id, err = w.decide(context.WithoutCancel(ctx), d)
		return err
	})
	if err != nil {
		return "", fmt.Errorf("log the decision: %w", err)
	}
	return id, nil
}

func (w *writer) decide(ctx context.Context, d Decision) (string, error) {
	ids, err := newIDs(1)
	if err != nil {
		return "", err
	}
	d.ID = ids[0]
	if d.At.IsZero() {
		d.At = time.Now()
	}
	return d.ID, w.addDecision(ctx, &d, nil)
}

// addDecision writes a decision's rows and its entry in the chain.
func (w *writer) addDecision(ctx context.Context, d *Decision, origin *place) error {
	revision, err := w.revision(ctx, d.Board, d.Revision)
	if err != nil {
		return err
	}
	var whole any
	if d.Recommendation != nil {
		whole = string(d.Recommendation)
	}
	n := d.Network
	seq, err := w.insert(ctx, insertDecision, d.ID, revision, timeText(d.At), string(n.Kind),
		n.C, orNull(n.CTol), orNull(n.R), orNull(n.RTol), d.LimitV,
		d.Peak.Value, orNull(d.Peak.U), d.Peak.Low, d.Peak.High, orNull(d.Damping), orNull(d.LossW),
		d.Excitation.Bus, d.Excitation.Current, orNull(d.SwitchingHz),
		d.Loop.Inductance, d.Loop.Capacitance, orNull(d.Loop.Resistance), d.Digest, whole)
	if err != nil {
		return err
	}
	s, err := w.stmt(ctx, insertDecisionTrial)
	if err != nil {
		return err
	}
	for _, trial := range d.Trials {
		result, err := s.ExecContext(ctx, seq, trial, revision)
		if err != nil {
			return err
		}
		if found, err := result.RowsAffected(); err != nil {
			return err
		} else if found != 1 {
			return fmt.Errorf("trial %s, which it rests on: %w of board %s, revision %s, in this logbook; name trials by their whole ids",
				quote(trial), ErrNoTrial, quote(d.Board), quote(d.Revision))
		}
	}
	return w.chain(ctx, &entry{decision: d}, seq, origin)
}

// checkDecision reports the first thing in d that no logbook can hold.
func checkDecision(d Decision) error {
	if d.ID != "" {
		return fmt.Errorf("it has the id %s already, so it is in a logbook; leave the id empty to log it as a new decision", quote(d.ID))
	}
	for _, f := range []struct{ column, text string }{{"board", d.Board}, {"revision", d.Revision}} {
		if f.text == "" {
			return bad(f.column, "it is empty; name the %s", f.column)
		}
		if err := checkName(f.column, f.text); err != nil {
			return err
		}
	}
	if y := d.At.UTC().Year(); !d.At.IsZero() && (y < 1900 || y > 9999) {
		return bad("at", "the year %d; it must lie from 1900 to 9999", y)
	}
	if d.Network.Kind == snubber.Bare {
		return bad("network", "bare; a decision recommends c, rc or rcd")
	}
	if err := checkNetwork(d.Network); err != nil {
		return err
	}
	if err := d.Loop.Check(); err != nil {
		return err
	}
	for _, f := range []struct {
		column string
		value  float64
		zero   bool // whether zero means "not stated"
	}{
		{"limit_v", d.LimitV, false}, {"peak_v", d.Peak.Value, false}, {"peak_v_u", d.Peak.U, true},
		{"damping_ratio", d.Damping, true}, {"loss_w", d.LossW, true}, {"bus_v", d.Excitation.Bus, false},
		{"excitation_a", d.Excitation.Current, true}, {"switching_hz", d.SwitchingHz, true},
	} {
		if !(f.value > 0 || f.zero && f.value == 0) || math.IsInf(f.value, 0) {
			return bad(f.column, "%g; it must be a positive, finite number", f.value)
		}
	}
	if !(d.Peak.Low <= d.Peak.High) || !finite(d.Peak.Low) || !finite(d.Peak.High) {
		return bad("peak_v", "an interval from %g to %g; its ends must be finite numbers in order", d.Peak.Low, d.Peak.High)
	}
	if raw, err := hex.DecodeString(d.Digest); err != nil || len(raw) != 32 || d.Digest != hex.EncodeToString(raw) {
		return bad("digest", "%s is not a SHA-256 in 64 lower-case hexadecimal digits; make it with TrialsDigest", quote(d.Digest))
	}
	if len(d.Trials) == 0 {
		return bad("trials", "there are none; a decision rests on trials")
	}
	seen := map[string]bool{}
	for _, id := range d.Trials {
		if seen[id] {
			return bad("trials", "%s is there twice; name each once", quote(id))
		}
		seen[id] = true
	}
	if d.Recommendation != nil && !json.Valid(d.Recommendation) {
		return bad("recommendation", "%s is not JSON", quote(string(d.Recommendation)))
	}
	return nil
}
