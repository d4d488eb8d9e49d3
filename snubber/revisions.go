package snubber

import (
	"context"
	"errors"
	"fmt"
	"math"

	"ringbook/snubber/leastsq"
)

// Comparison is two or more board revisions side by side. A nil estimate is a quantity that the trials cannot tell.
type Comparison struct {
	Point       OperatingPoint    `json:"-"`            // at which the currents and peaks are
	Fits        []*FitResult      `json:"fits"`         // each revision by its own trials alone
	Revisions   []RevisionFigures `json:"revisions"`    // each revision by the fit of all together
	Differences []Difference      `json:"differences"`  // of each later revision from the first, quantity by quantity
	SharedParts []SharedPart      `json:"shared_parts"` // taken for the same physical parts on several revisions
	Chi2        float64           `json:"chi2"`         // of the fit of all together
	DOF         int               `json:"dof"`
	Status      string            `json:"status"`   // "converged", or how else that fit ended
	Warnings    []string          `json:"warnings"` // about the comparison; those about a revision are with its fit
}

// RevisionFigures is a revision as the fit of all revisions together has it. What the trials of one revision say of a
// part helps where it served on another, so that the figures may differ from those of the revision's own fit, by less than
// their uncertainty. The differences are those of these figures.
type RevisionFigures struct {
	Board      string    `json:"board"`
	Revision   string    `json:"revision"`
	Loop       LoopFit   `json:"loop"`
	Excitation *Estimate `json:"excitation_a"` // A: at the operating point; nil where no peak was read there
	Peak       *Estimate `json:"peak_v"`       // V: of the bare node at the operating point, without a probe
}

// Difference is how a quantity of one revision differs from that of another.
type Difference struct {
	Quantity string    `json:"quantity"` // by its name in JSON, with its unit: inductance_h, peak_v
	From     string    `json:"from"`     // the revision it is counted from; board and revision where the boards differ
	To       string    `json:"to"`
	Delta    *Estimate `json:"delta"`    // To less From, in the quantity's unit
	Relative *Estimate `json:"relative"` // To/From less one; nil where From may be zero

	// ProbabilityReal is the probability that the true difference has the sign of Delta.Value, in the same distribution
	// (GUM Supplement 1: the state of knowledge, with no preference beforehand for any size of difference) from which Delta's
	// interval comes. It runs from 0.5, where the trials do not tell more from less, by 0.975, where the 95 % interval ends
	// at zero, to 1. It is one less half the two-sided p-value, and it is not the probability that the revisions differ at
	// all: two layouts are never quite equal, so that readings can tell only which way, and by how much.
	ProbabilityReal float64 `json:"probability_real"`
}

// SharedPart is a part that served on several revisions, and whose one error all of them share.
type SharedPart struct {
	Known     string   `json:"known_by"` // by what its uses are known to be of one part: "part ..." or "session ..."
	C         float64  `json:"c_f"`      // F: nominal; 0: it is a resistor
	R         float64  `json:"r_ohm"`    // ohm: nominal; 0: it is a capacitor
	Revisions []string `json:"revisions"`
}

// CompareRevisions compares board revisions by their trials: one set of trials for each, the first the reference.
//
// Each revision is fitted alone first, which chooses its effects and sets trials aside (see Fit). Then all are fitted
// together, each with its own loop, currents and effects, and every physical part with one error wherever it served: where
// two revisions were read with the same capacitors, what is wrong with those moves both loops alike and leaves their
// difference alone (GUM 5.2, F.1.2.3: input quantities common to several results correlate them). Parts are one by the
// same words for the part, or by the same nominal value and tolerance in the same session, as in Fit; those of trials that name
// neither are one within a revision only. A shared part with which the revisions' readings disagree, so that chi-square falls
// by more than chance lets it when each revision has a part of its own, is taken for two parts, and a warning says so. The
// readings tell such parts only against the others: they cannot tell that all of them are off in one ratio.
//
// A revision whose trials scatter more than they state enters with its uncertainties widened as its own fit has them; where
// all together still scatter more, all are widened likewise.
//
// What Fit allows for between a node's capacitance as it rings and at rest (half a percent, where a bus is stated) counts for
// each revision by itself: two with the same switch may be closer known than said.
//
// The operating point is where the currents and bare peaks are compared. Where a revision read no peak there, its peak is the
// prediction of Ahead with the load current, and a warning says so; where that is not known either there is none.
func CompareRevisions(ctx context.Context, sets [][]Trial, at OperatingPoint) (*Comparison, error) {
	c, err := compareRevisions(ctx, sets, at)
	if err != nil {
		return nil, fmt.Errorf("comparing revisions: %w", err)
	}
	return c, nil
}

func compareRevisions(ctx context.Context, sets [][]Trial, at OperatingPoint) (*Comparison, error) {
	if len(sets) < 2 {
		return nil, fmt.Errorf("%s given, where it takes two or more to compare", count(len(sets), "revision"))
	}
	c := &Comparison{Point: at, Differences: []Difference{}, SharedParts: []SharedPart{}, Warnings: []string{}}
	for k, trials := range sets {
		f, err := fitTrials(ctx, trials)
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		if err != nil {
			return nil, fmt.Errorf("%s: %w", nameOfSet(k, trials), err)
		}
		for _, x := range c.Fits {
			if x.Board == f.Board && x.Revision == f.Revision {
				return nil, fmt.Errorf("%s %s is given twice: put the trials of one revision together, or name another", f.Board, f.Revision)
			}
		}
		c.Fits = append(c.Fits, f)
	}
	t := newTogether(c.Fits, true)
	if err := t.settle(ctx, c); err != nil {
		return nil, err
	}
	if t.fit.Cov == nil {
		return nil, errors.New("the trials of all revisions together cannot tell their loops; take one more trial of each with another capacitor")
	}
	c.Chi2, c.DOF, c.Status = t.fit.Chi2, t.dof(), t.fit.Status.String()
	if t.fit.Status != leastsq.Converged {
		c.Warnings = append(c.Warnings, "the fit of all revisions together did not converge: "+t.fit.Reason)
	}
	t.describe(c)
	t.shared(c)
	t.buses(c)
	return c, nil
}

// nameOfSet names a set of trials by what its first one is of.
func nameOfSet(k int, trials []Trial) string {
	if len(trials) == 0 {
		return fmt.Sprintf("set %d of trials", k+1)
	}
	return trials[0].Board + " " + trials[0].Revision
}

// name is what a revision is called in the comparison.
func (c *Comparison) name(k int) string {
	for _, f := range c.Fits {
		if f.Board != c.Fits[0].Board {
			return c.Fits[k].Board + " " + c.Fits[k].Revision
		}
	}
	return c.Fits[k].Revision
}

// buses warns where the capacitances are those of different bus voltages.
func (t *together) buses(c *Comparison) {
	for k, m := range t.models[1:] {
		a, b := t.models[0].ref, m.ref
		if a > 0 && b > 0 && math.Abs(a-b) > samePoint*math.Max(a, b) {
			c.Warnings = append(c.Warnings, fmt.Sprintf("the capacitance of %s is that at %.4g V and of %s that at %.4g V, and a node's falls with its voltage: read both at one bus",
				c.name(0), a, c.name(k+1), b))
		}
	}
}
