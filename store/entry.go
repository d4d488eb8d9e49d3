package store

import (
	"slices"
	"time"

	"ringbook/snubber"
)

// The kinds of entry, and the tables they are in.
const (
	trialKind      = "trial"
	strikeKind     = "strike"
	decisionKind   = "decision"
	correctionKind = "correction"
)

// entry is what one row of the chain stands for, with all that belongs to it, in terms that hold in every file: ids and
// names, no row numbers. One of the four is set.
type entry struct {
	trial      *loggedTrial
	strike     *loggedStrike
	decision   *Decision
	correction *loggedCorrection
}

type loggedTrial struct {
	snubber.Trial // Struck is not part of it: a strike is an entry of its own
	loggedAt      time.Time
	waveforms     []packed // in the order logged
}

type loggedStrike struct {
	id, trial string
	at        time.Time
	because   string
}

// loggedCorrection is what was stated of a board, or of a revision of it where that is named.
type loggedCorrection struct {
	id              string
	board, revision string
	at              time.Time // zero: before schema 4, which noted no time
	deviceV         float64
	note            string
}

func (e *entry) kind() string {
	switch {
	case e.trial != nil:
		return trialKind
	case e.strike != nil:
		return strikeKind
	case e.decision != nil:
		return decisionKind
	default:
		return correctionKind
	}
}

func (e *entry) id() string {
	switch {
	case e.trial != nil:
		return e.trial.ID
	case e.strike != nil:
		return e.strike.id
	case e.decision != nil:
		return e.decision.ID
	default:
		return e.correction.id
	}
}

// text appends the entry's canonical text: the lines of TrialsDigest for a trial, and lines in the same style for the rest.
// It never changes: its digests are in logbooks.
func (e *entry) text(b []byte) []byte {
	switch {
	case e.trial != nil:
		return e.trial.text(b)
	case e.strike != nil:
		s := e.strike
		b = line(b, "strike", s.id)
		b = line(b, "trial", s.trial)
		b = line(b, "at", timeText(s.at))
		return line(b, "because", s.because)
	case e.decision != nil:
		return decisionText(b, e.decision)
	default:
		c := e.correction
		b = line(b, "correction", c.id)
		b = line(b, "board", c.board)
		b = line(b, "revision", c.revision)
		if !c.at.IsZero() {
			b = line(b, "at", timeText(c.at))
		}
		b = numberLine(b, "device_v", c.deviceV)
		return line(b, "note", c.note)
	}
}

func (t *loggedTrial) text(b []byte) []byte {
	b = appendTrial(b, &t.Trial)
	b = line(b, "logged_at", timeText(t.loggedAt))
	for i := range t.waveforms {
		w := &t.waveforms[i]
		b = line(b, "waveform", w.id)
		b = append(decimal(append(b, "start_s "...), w.Start), '\n')
		b = numberLine(b, "interval_s", w.Interval)
		b = numberLine(b, "step_v", w.StepV)
		b = line(b, "encoding", w.encoding)
		b = append(hexadecimal(append(b, "sha256 "...), w.digest[:]), '\n')
		b = line(b, "origin", w.Origin)
	}
	return b
}

func decisionText(b []byte, d *Decision) []byte {
	b = line(b, "decision", d.ID)
	b = line(b, "board", d.Board)
	b = line(b, "revision", d.Revision)
	b = line(b, "at", timeText(d.At))
	b = line(b, "network", string(d.Network.Kind))
	for _, f := range []struct {
		name  string
		value float64
	}{
		{"c", d.Network.C}, {"c_tol", d.Network.CTol}, {"r", d.Network.R}, {"r_tol", d.Network.RTol}, {"limit_v", d.LimitV},
		{"peak_v", d.Peak.Value}, {"peak_v_u", d.Peak.U}, {"peak_v_low", d.Peak.Low}, {"peak_v_high", d.Peak.High},
		{"damping_ratio", d.Damping}, {"loss_w", d.LossW},
		{"bus_v", d.Excitation.Bus}, {"excitation_a", d.Excitation.Current}, {"switching_hz", d.SwitchingHz},
		{"inductance_h", d.Loop.Inductance}, {"capacitance_f", d.Loop.Capacitance}, {"resistance_ohm", d.Loop.Resistance},
	} {
		b = numberLine(b, f.name, f.value)
	}
	b = line(b, "digest", d.Digest)
	for _, id := range slices.Sorted(slices.Values(d.Trials)) {
		b = line(b, "rests_on", id)
	}
	return line(b, "recommendation", string(d.Recommendation))
}
