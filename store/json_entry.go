package store

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"time"

	"ringbook/snubber"
	"ringbook/snubber/waveform"
)

// The lines of an export as JSON: names and units as in the logbook's tables, what is not stated left out.

type jsonLine struct {
	Trial      *jsonTrial      `json:"trial,omitempty"`
	Strike     *jsonStrike     `json:"strike,omitempty"`
	Decision   *jsonDecision   `json:"decision,omitempty"`
	Correction *jsonCorrection `json:"correction,omitempty"`
	Origin     jsonOrigin      `json:"origin"`
}

// jsonOrigin is where the entry was first logged, with its links there in hexadecimal.
type jsonOrigin struct {
	Logbook  string `json:"logbook"`
	Entry    int64  `json:"entry"`
	Previous string `json:"previous"`
	Link     string `json:"link"`
}

type jsonTrial struct {
	ID          string         `json:"id"`
	Board       string         `json:"board"`
	Revision    string         `json:"revision"`
	Session     string         `json:"session,omitempty"`
	At          string         `json:"at"`
	LoggedAt    string         `json:"logged_at"`
	Network     string         `json:"network"`
	C           float64        `json:"c,omitempty"`
	CTol        float64        `json:"c_tol,omitempty"`
	R           float64        `json:"r,omitempty"`
	RTol        float64        `json:"r_tol,omitempty"`
	ESR         float64        `json:"esr,omitempty"`
	MeasuredC   float64        `json:"measured_c,omitempty"`
	MeasuredU   float64        `json:"measured_c_u,omitempty"`
	ProbeC      float64        `json:"probe_c,omitempty"`
	BusV        float64        `json:"bus_v,omitempty"`
	CurrentA    float64        `json:"current_a,omitempty"`
	SwitchingHz float64        `json:"switching_hz,omitempty"`
	Part        string         `json:"part,omitempty"`
	Note        string         `json:"note,omitempty"`
	Readings    []jsonReading  `json:"readings"`
	Waveforms   []jsonWaveform `json:"waveforms,omitempty"`
}

type jsonReading struct {
	Quantity     string    `json:"quantity"`
	Value        float64   `json:"value"`
	U            float64   `json:"u,omitempty"`
	Instrument   string    `json:"instrument,omitempty"`
	FromWaveform bool      `json:"from_waveform,omitempty"`
	Repeats      []float64 `json:"repeats,omitempty"`
}

type jsonWaveform struct {
	ID        string  `json:"id"`
	StartS    float64 `json:"start_s"`
	IntervalS float64 `json:"interval_s"`
	StepV     float64 `json:"step_v,omitempty"`
	Encoding  string  `json:"encoding"`
	Samples   []byte  `json:"samples"` // packed as encoding says; base 64
	Origin    string  `json:"origin,omitempty"`
}

type jsonStrike struct {
	ID      string `json:"id"`
	Trial   string `json:"trial"`
	At      string `json:"at"`
	Because string `json:"because"`
}

type jsonDecision struct {
	ID             string   `json:"id"`
	Board          string   `json:"board"`
	Revision       string   `json:"revision"`
	At             string   `json:"at"`
	Network        string   `json:"network"`
	C              float64  `json:"c"`
	CTol           float64  `json:"c_tol,omitempty"`
	R              float64  `json:"r,omitempty"`
	RTol           float64  `json:"r_tol,omitempty"`
	LimitV         float64  `json:"limit_v"`
	PeakV          float64  `json:"peak_v"`
	PeakVU         float64  `json:"peak_v_u,omitempty"`
	PeakVLow       float64  `json:"peak_v_low"`
	PeakVHigh      float64  `json:"peak_v_high"`
	DampingRatio   float64  `json:"damping_ratio,omitempty"`
	LossW          float64  `json:"loss_w,omitempty"`
	BusV           float64  `json:"bus_v"`
	ExcitationA    float64  `json:"excitation_a"`
	SwitchingHz    float64  `json:"switching_hz,omitempty"`
	InductanceH    float64  `json:"inductance_h"`
	CapacitanceF   float64  `json:"capacitance_f"`
	ResistanceOhm  float64  `json:"resistance_ohm,omitempty"`
	Trials         []string `json:"trials"`
	Digest         string   `json:"digest"`
	Recommendation string   `json:"recommendation,omitempty"` // its JSON as a text, for it is kept to the last space
}

type jsonCorrection struct {
	ID       string  `json:"id"`
	Board    string  `json:"board"`
	Revision string  `json:"revision,omitempty"`
	At       string  `json:"at,omitempty"`
	DeviceV  float64 `json:"device_v,omitempty"`
	Note     string  `json:"note,omitempty"`
}

func lineOf(e *entry, origin place) *jsonLine {
	l := &jsonLine{Origin: jsonOrigin{origin.logbook, origin.seq, hex.EncodeToString(origin.previous[:]), hex.EncodeToString(origin.link[:])}}
	switch {
	case e.trial != nil:
		t, n, p := e.trial, &e.trial.Network, e.trial.Point
		j := &jsonTrial{t.ID, t.Board, t.Revision, t.Session, timeText(t.At), timeText(t.loggedAt), string(n.Kind),
			n.C, n.CTol, n.R, n.RTol, n.ESR, n.MeasuredC, n.MeasuredU, t.ProbeC, p.BusV, p.CurrentA, p.SwitchingHz, t.Part, t.Note,
			make([]jsonReading, len(t.Readings)), nil}
		for i, r := range t.Readings {
			j.Readings[i] = jsonReading{string(r.Quantity), r.Value, r.U, r.Instrument, r.FromWaveform, r.Repeats}
		}
		for _, w := range t.waveforms {
			j.Waveforms = append(j.Waveforms, jsonWaveform{w.id, w.Start, w.Interval, w.StepV, w.encoding, w.samples, w.Origin})
		}
		l.Trial = j
	case e.strike != nil:
		s := e.strike
		l.Strike = &jsonStrike{s.id, s.trial, timeText(s.at), s.because}
	case e.decision != nil:
		d := e.decision
		l.Decision = &jsonDecision{d.ID, d.Board, d.Revision, timeText(d.At), string(d.Network.Kind),
			d.Network.C, d.Network.CTol, d.Network.R, d.Network.RTol, d.LimitV,
			d.Peak.Value, d.Peak.U, d.Peak.Low, d.Peak.High, d.Damping, d.LossW, d.Excitation.Bus, d.Excitation.Current, d.SwitchingHz,
			d.Loop.Inductance, d.Loop.Capacitance, d.Loop.Resistance, d.Trials, d.Digest, string(d.Recommendation)}
	default:
		c := e.correction
		l.Correction = &jsonCorrection{c.id, c.board, c.revision, "", c.deviceV, c.note}
		if !c.at.IsZero() {
			l.Correction.At = timeText(c.at)
		}
	}
	return l
}

// entry is what the line says, and where that was first logged.
func (l *jsonLine) entry() (e *entry, origin place, err error) {
	at := func(text string) time.Time {
		t, fault := time.Parse(timeLayout, text)
		if fault != nil && err == nil {
			err = bad("at", "%s is not a time as %s", quote(text), timeLayout)
		}
		return t
	}
	e = &entry{}
	n := 0
	if j := l.Trial; j != nil {
		n++
		t := &loggedTrial{loggedAt: at(j.LoggedAt)}
		t.Trial = snubber.Trial{ID: j.ID, Board: j.Board, Revision: j.Revision, At: at(j.At), Session: j.Session,
			Network: snubber.Network{Kind: snubber.Kind(j.Network), C: j.C, CTol: j.CTol, R: j.R, RTol: j.RTol, ESR: j.ESR, MeasuredC: j.MeasuredC, MeasuredU: j.MeasuredU},
			Point:   snubber.OperatingPoint{BusV: j.BusV, CurrentA: j.CurrentA, SwitchingHz: j.SwitchingHz},
			ProbeC:  j.ProbeC, Part: j.Part, Note: j.Note}
		for _, r := range j.Readings {
			t.Readings = append(t.Readings, snubber.Reading{Quantity: snubber.Quantity(r.Quantity), Value: r.Value, U: r.U,
				Repeats: r.Repeats, Instrument: r.Instrument, FromWaveform: r.FromWaveform})
		}
		for _, w := range j.Waveforms {
			t.waveforms = append(t.waveforms, packed{id: w.ID, Record: waveform.Record{Start: w.StartS, Interval: w.IntervalS, StepV: w.StepV, Origin: w.Origin},
				samples: w.Samples, encoding: w.Encoding, digest: sha256.Sum256(w.Samples)})
		}
		e.trial = t
	}
	if j := l.Strike; j != nil {
		n++
		e.strike = &loggedStrike{j.ID, j.Trial, at(j.At), j.Because}
	}
	if j := l.Decision; j != nil {
		n++
		e.decision = &Decision{ID: j.ID, Board: j.Board, Revision: j.Revision, At: at(j.At),
			Network: snubber.Network{Kind: snubber.Kind(j.Network), C: j.C, CTol: j.CTol, R: j.R, RTol: j.RTol}, LimitV: j.LimitV,
			Peak: snubber.Estimate{Value: j.PeakV, U: j.PeakVU, Low: j.PeakVLow, High: j.PeakVHigh}, Damping: j.DampingRatio, LossW: j.LossW,
			Excitation: snubber.Excitation{Bus: j.BusV, Current: j.ExcitationA}, SwitchingHz: j.SwitchingHz,
			Loop:   snubber.Loop{Inductance: j.InductanceH, Capacitance: j.CapacitanceF, Resistance: j.ResistanceOhm},
			Trials: j.Trials, Digest: j.Digest}
		if j.Recommendation != "" {
			e.decision.Recommendation = json.RawMessage(j.Recommendation)
		}
	}
	if j := l.Correction; j != nil {
		n++
		e.correction = &loggedCorrection{id: j.ID, board: j.Board, revision: j.Revision, deviceV: j.DeviceV, note: j.Note}
		if j.At != "" {
			e.correction.at = at(j.At)
		}
	}
	if n != 1 {
		return nil, origin, fmt.Errorf("it has %d of trial, strike, decision and correction; each line is one of them", n)
	}
	if err != nil {
		return nil, origin, err
	}
	origin = place{logbook: l.Origin.Logbook, seq: l.Origin.Entry}
	for _, x := range []struct {
		name, text string
		into       *link
	}{{"previous", l.Origin.Previous, &origin.previous}, {"link", l.Origin.Link, &origin.link}} {
		raw, err := hex.DecodeString(x.text)
		if err != nil || len(raw) != sha256.Size {
			return nil, origin, bad(x.name, "%s is not a SHA-256 in 64 hexadecimal digits", quote(x.text))
		}
		copy(x.into[:], raw)
	}
	if err := checkID(origin.logbook); err != nil {
		return nil, origin, fmt.Errorf("origin: %w", err)
	}
	if origin.seq < 1 {
		return nil, origin, bad("entry", "%d; it counts from 1", origin.seq)
	}
	return e, origin, nil
}
