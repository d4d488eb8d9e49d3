package recipes

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"math"

	"ringbook/snubber"
	"ringbook/store"
)

// Decide logs a recommendation that meets its limits as a decision, with the trials it rests on, and gives the decision's
// id. Where the revision's last decision rests on the same trials and says the same, that one stands: fresh is false, and
// nothing is logged. The logbook must be open for writing.
func Decide(ctx context.Context, src Source, fit *snubber.FitResult, rec *snubber.Recommendation) (id string, fresh bool, err error) {
	d, err := decision(ctx, src, fit, rec)
	if err != nil {
		return "", false, fmt.Errorf("log the decision: %w", err)
	}
	for last, err := range src.Logbook.Decisions(ctx, store.Scope{Board: d.Board, Revision: d.Revision, Limit: 1}) {
		if err != nil {
			return "", false, err
		}
		if sameDecision(last, d) {
			return last.ID, false, nil
		}
	}
	id, err = src.Logbook.AddDecision(ctx, d)
	return id, err == nil, err
}

func decision(ctx context.Context, src Source, fit *snubber.FitResult, rec *snubber.Recommendation) (store.Decision, error) {
	trials, err := src.Trials(ctx)
	if err != nil {
		return store.Decision{}, err
	}
	if len(trials) != fit.Trials {
		return store.Decision{}, errors.New("a trial was logged or struck while it was computed; recommend again")
	}
	whole, err := json.Marshal(rec)
	if err != nil {
		return store.Decision{}, err
	}
	lim, c := src.Limits, rec.Choice
	d := store.Decision{
		Board: fit.Board, Revision: fit.Revision,
		Network: snubber.Network{Kind: c.Network, C: c.C, CTol: lim.CTol},
		LimitV:  rec.LimitV, Peak: *c.Peak, LossW: c.LossW,
		Loop: rec.Loop, Excitation: rec.Excitation, SwitchingHz: rec.SwitchingHz,
		Digest: store.TrialsDigest(trials), Recommendation: whole,
	}
	if c.Network.HasR() {
		d.Network.R, d.Network.RTol = c.R, lim.RTol
	}
	if c.Damping != nil {
		d.Damping = c.Damping.Value
	}
	for _, t := range trials {
		d.Trials = append(d.Trials, t.ID)
	}
	return d, nil
}

// sameDecision says whether two decisions say the same from the same trials. Figures computed anew may differ in their last
// digits.
func sameDecision(a, b store.Decision) bool {
	near := func(x, y float64) bool { return math.Abs(x-y) <= 1e-6*math.Max(math.Abs(x), math.Abs(y)) }
	return a.Digest == b.Digest && a.Network == b.Network && near(a.LimitV, b.LimitV) &&
		near(a.Peak.Value, b.Peak.Value) && near(a.Peak.U, b.Peak.U) && near(a.Excitation.Bus, b.Excitation.Bus)
}
