package recipes

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"
)

// ErrUnproven is of a decision that no trial can confirm or refute yet.
var ErrUnproven = errors.New("no trial to hold it against")

// Confirmation is a logged decision's prediction beside what was then measured.
type Confirmation struct {
	Decision  string `json:"decision"`
	Board     string `json:"board"`
	Revision  string `json:"revision"`
	Confirmed bool   `json:"confirmed"` // the two agree, and the limit is kept
	*snubber.Confirmation
	Verdict  string   `json:"verdict"`
	Warnings []string `json:"warnings"`

	decision   store.Decision
	trials     []snubber.Trial // those that measured it
	bareTrials []snubber.Trial // of those it rests on, with nothing fitted
}

// otherPoint is by how much of itself a bus voltage or a load current may differ for the operating point to be the same.
const otherPoint = 0.02

// Confirm holds a decision against the trials in scope that fitted its network at its operating point since it was logged.
// A trial from before, or one that the decision rests on, is evidence for it and no proof. Errors are ErrUnproven where
// no trial serves.
func Confirm(ctx context.Context, src Source, d store.Decision) (*Confirmation, error) {
	src.Scope.Board, src.Scope.Revision = d.Board, d.Revision
	if src.Scope.Since.Before(d.At) {
		src.Scope.Since = d.At
	}
	since, err := src.Trials(ctx)
	if err != nil {
		return nil, err
	}
	out := &Confirmation{Decision: d.ID, Board: d.Board, Revision: d.Revision, Warnings: []string{}, decision: d}
	load, err := out.evidence(ctx, src)
	if err != nil {
		return nil, err
	}
	var elsewhere []string
	for _, t := range since {
		if _, read := t.Reading(snubber.PeakV); !read || !fits(d.Network, t.Network) || slices.Contains(d.Trials, t.ID) {
			continue
		}
		at := t.Operating()
		if at.BusV != 0 && apart(at.BusV, d.Excitation.Bus) {
			elsewhere = append(elsewhere, fmt.Sprintf("trial %s was read at a bus of %s and the prediction is for %s", store.ShortID(t.ID),
				quantity.Format(at.BusV, quantity.Voltage, 3), quantity.Format(d.Excitation.Bus, quantity.Voltage, 3)))
			continue
		}
		if at.CurrentA != 0 && load != 0 && apart(at.CurrentA, load) {
			out.Warnings = append(out.Warnings, fmt.Sprintf("trial %s was read at a load current of %s and the trials behind the decision at %s: the loop current may differ; read it at the same load",
				store.ShortID(t.ID), quantity.Format(at.CurrentA, quantity.Current, 3), quantity.Format(load, quantity.Current, 3)))
		}
		out.trials = append(out.trials, t)
	}
	if len(out.trials) == 0 {
		return nil, out.unproven(elsewhere)
	}
	for _, e := range elsewhere {
		out.Warnings = append(out.Warnings, e+", so it was left out")
	}
	said := snubber.Prediction{Network: d.Network, Loop: d.Loop, Excitation: d.Excitation, Peak: d.Peak, LimitV: d.LimitV}
	if out.Confirmation, err = said.Confirm(out.trials); err != nil {
		return nil, err
	}
	out.Confirmed = out.Agrees && out.Keeps
	out.Verdict = out.verdict()
	return out, nil
}

// evidence looks at the trials the decision rests on, warns where they are not what they were, and gives the largest load
// current they state.
func (c *Confirmation) evidence(ctx context.Context, src Source) (load float64, err error) {
	var trials []snubber.Trial
	for t, err := range src.Logbook.DecisionTrials(ctx, c.Decision) {
		if err != nil {
			return 0, err
		}
		src.used.add(&t)
		trials = append(trials, t)
		if t.Network.Kind == snubber.Bare && t.Struck == "" {
			c.bareTrials = append(c.bareTrials, t)
		}
		load = math.Max(load, t.Operating().CurrentA)
		if t.Struck != "" {
			c.Warnings = append(c.Warnings, fmt.Sprintf("trial %s, which the decision rests on, has been struck (%s); recommend again without it", store.ShortID(t.ID), t.Struck))
		}
	}
	if store.TrialsDigest(trials) != c.decision.Digest {
		c.Warnings = append(c.Warnings, "the trials the decision rests on are not what they were when it was logged: their digest differs; another program has changed the logbook, so go back to a backup, or recommend again")
	}
	return load, nil
}

func (c *Confirmation) unproven(elsewhere []string) error {
	n := c.decision.Network
	if len(elsewhere) > 0 {
		return fmt.Errorf("confirming decision %s: %w: %s; take one at that bus", store.ShortID(c.Decision), ErrUnproven, elsewhere[0])
	}
	parts := "--c " + quantity.Code(n.C, quantity.Capacitance)
	if n.Kind.HasR() {
		parts += " --r " + quantity.Code(n.R, quantity.Resistance)
	}
	return fmt.Errorf("confirming decision %s: %w: none since %s fitted %s and read its peak; fit that and log it with `ringbook trial take --board %q --revision %q --network %s %s`",
		store.ShortID(c.Decision), ErrUnproven, c.decision.At.UTC().Format("2006-01-02 15:04:05 UTC"), wording(n), c.Board, c.Revision, n.Kind, parts)
}

// verdict is what the measurement says of the prediction and the limit, and where it does not agree, of the loop.
func (c *Confirmation) verdict() string {
	by := quantity.Format(math.Abs(c.OffV), quantity.Voltage, 2)
	over := quantity.Format(c.Measured.Value-c.ProbeV-c.LimitV, quantity.Voltage, 2)
	switch {
	case c.Agrees && c.Keeps:
		return "The peak measured agrees with the prediction and stays under the limit."
	case c.Agrees:
		return fmt.Sprintf("The peak measured agrees with the prediction and exceeds the limit by %s: the two are not known well enough to tell them apart, and the limit lies between. Recommend again with this trial among the others, or with more margin.", over)
	}
	side, cause := "higher", "a longer path to the capacitor or a capacitor below its value"
	if c.OffV < 0 {
		side, cause = "lower", "a probe too slow for the peak or a lighter load"
	}
	what := "stays under the limit but"
	if !c.Keeps {
		what = "exceeds the limit by " + over + " and"
	}
	s := fmt.Sprintf("The peak measured %s does not agree with the prediction: it is %s (%.0f %%) %s. ", what, by, 100*math.Abs(c.OffV)/c.Predicted.Value, side)
	if why := c.explain(); why != "" {
		s += why + "; so would " + cause + ". "
	} else {
		s += "The loop is not what the trials said, or a part is not what it says: look for " + cause + ". "
	}
	return s + "Read the bare node again at this operating point, check the parts, and recommend again."
}

func wording(n snubber.Network) string {
	c := quantity.Code(n.C, quantity.Capacitance)
	if !n.Kind.HasR() {
		return c
	}
	s := quantity.Code(n.R, quantity.Resistance) + " in series with " + c
	if n.Kind == snubber.RCD {
		s += " and a diode across the resistor"
	}
	return s
}

// fits says whether a trial fitted the network decided on, by the parts' nominal values.
func fits(want, got snubber.Network) bool {
	same := func(a, b float64) bool { return math.Abs(a-b) <= 1e-9*math.Max(math.Abs(a), math.Abs(b)) }
	return want.Kind == got.Kind && same(want.C, got.C) && same(want.R, got.R)
}

func apart(a, b float64) bool { return math.Abs(a-b) > otherPoint*math.Max(math.Abs(a), math.Abs(b)) }

// proofFigures are the prediction beside the measurement.
func proofFigures(c *Confirmation) []page.Figure {
	remark := ""
	if u := math.Hypot(c.Measured.U, c.Predicted.U); math.Abs(c.ProbeV) > 0.3*u {
		remark = fmt.Sprintf("the probe's capacitance makes %+.1g V of it", c.ProbeV)
	}
	return []page.Figure{
		{Name: "peak predicted", CSV: "predicted_v", Unit: quantity.Voltage, Value: c.Predicted},
		{Name: "peak measured", CSV: "measured_v", Unit: quantity.Voltage, Value: c.Measured, Remark: remark},
		{Name: "limit", CSV: "limit_v", Unit: quantity.Voltage, Value: c.LimitV},
	}
}

// ProofFigures puts a prediction beside what was then measured.
func ProofFigures(p *page.Page, c *Confirmation) {
	p.Figures(proofFigures(c)...)
	if c.Confirmed {
		p.Say("%s", c.Verdict)
	} else {
		p.Say("**Not confirmed.** %s", c.Verdict)
	}
	for _, w := range c.Warnings {
		p.Warn("%s.", w)
	}
}

// ProofPage puts a confirmation on a page: what was decided, the prediction beside the measurement, and the trials.
func ProofPage(p *page.Page, c *Confirmation) {
	p.Say("Decision %s of %s, from %s: fit %s.", store.ShortID(c.Decision), c.decision.At.UTC().Format("2006-01-02 15:04 UTC"),
		count(len(c.decision.Trials), "trial"), wording(c.decision.Network))
	ProofFigures(p, c)
	p.Table(trialTable("Trials that fitted it since", c.trials))
}
