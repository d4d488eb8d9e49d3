package main

import (
	"context"
	"iter"

	"ringbook/snubber"
	"ringbook/store"
)

// printTrials writes the trials in scope as JSON, one after another, so that a long history needs no memory.
func (a *app) printTrials(ctx context.Context, lb *store.Logbook, s store.Scope) error {
	return a.printList("trials", func(yield func(any, error) bool) {
		for t, err := range lb.Trials(ctx, s) {
			if !yield(trialJSON(t), err) {
				return
			}
		}
	})
}

// logged says that a trial is on the disk, and what is doubtful about it.
func (a *app) logged(t snubber.Trial, id string, warnings []string) error {
	if a.json {
		t.ID = id
		answer := trialJSON(t)
		answer["warnings"] = append([]string{}, warnings...)
		return a.printJSON(answer)
	}
	for _, w := range warnings {
		a.progress("warning: %s", w)
	}
	return a.say("Trial %s is logged.", store.ShortID(id))
}

// trialJSON is a trial under the CSV's names, unscaled SI, null for what was not read or stated.
func trialJSON(t snubber.Trial) map[string]any {
	num := func(v float64) any {
		if v == 0 {
			return nil
		}
		return v
	}
	m := map[string]any{
		"id": t.ID, "board": t.Board, "revision": t.Revision, "network": t.Network.Kind,
		"c": num(t.Network.C), "c_tol": num(t.Network.CTol), "r": num(t.Network.R), "r_tol": num(t.Network.RTol),
		"probe_c": num(t.ProbeC), "bus_v": num(t.Point.BusV), "current_a": num(t.Point.CurrentA), "switching_hz": num(t.Point.SwitchingHz),
		"esr": num(t.Network.ESR), "measured_c": num(t.Network.MeasuredC), "measured_c_u": num(t.Network.MeasuredU), "session": t.Session,
		"at": t.At, "part": t.Part, "note": t.Note, "struck": nil,
	}
	if t.Struck != "" {
		m["struck"] = t.Struck
	}
	for _, q := range []snubber.Quantity{snubber.RingHz, snubber.DecayS, snubber.PeakV} {
		m[string(q)], m[string(q)+"_u"] = nil, nil
	}
	from := []snubber.Quantity{} // read from the trial's logged captures
	for _, r := range t.Readings {
		m[string(r.Quantity)], m[string(r.Quantity)+"_u"] = r.Value, num(r.U)
		if r.FromWaveform {
			from = append(from, r.Quantity)
		}
	}
	m["from_waveform"] = from
	return m
}

// printList writes {"name": [ ... ]} as the items come.
func (a *app) printList(name string, items iter.Seq2[any, error]) error {
	w := newListWriter(a.stdout, name)
	for item, err := range items {
		if err != nil {
			return err
		}
		if err := w.add(item); err != nil {
			return err
		}
	}
	return w.close()
}
