package recipes

import (
	"context"
	_ "embed"
	"fmt"
	"math"
	"slices"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"
)

//go:embed revisions.go
var revisionsSource string

// Revisions is the page of a board's revisions side by side: what each change of the layout did to the loop.
func Revisions(ctx context.Context, p *page.Page, src Source) error {
	p.Weave(revisionsSource)

	// ## The loops
	//
	// All revisions are fitted together, each with a loop of its own. A capacitor that served on several of them, known by
	// the same words for the part or by the same session, has one error for all: it moves the loops alike and leaves their
	// difference alone.
	c, err := src.Comparison(ctx)
	if err != nil {
		return err
	}
	p.Table(revisionsTable(c))
	p.Plot(revisionsPlot(c))

	// ## The differences
	//
	// Each later revision less the first. *More or less* is the probability that the true difference has the sign shown;
	// 97.5 % is where the 95 % interval touches zero. It is not the probability that the revisions differ at all.
	p.Table(differencesTable(c))
	sayComparison(p, c)
	return nil
}

// ComparisonPage puts a comparison on a page: the loops, their differences, and what to mind.
func ComparisonPage(p *page.Page, c *snubber.Comparison) {
	p.Table(revisionsTable(c))
	p.Table(differencesTable(c))
	sayComparison(p, c)
}

// Comparison compares the revisions in scope, at the hardest operating point of the first.
func (s Source) Comparison(ctx context.Context) (*snubber.Comparison, error) {
	revs, err := s.compared(ctx)
	if err != nil {
		return nil, err
	}
	var sets [][]snubber.Trial
	for _, r := range revs {
		one := s
		one.Scope.Board, one.Scope.Revision = r.Board, r.Name
		trials, err := one.Trials(ctx)
		if err != nil {
			return nil, err
		}
		sets = append(sets, trials)
	}
	first, err := snubber.Fit(ctx, sets[0])
	if err != nil {
		return nil, fmt.Errorf("comparing revisions: %s %s: %w", revs[0].Board, revs[0].Name, err)
	}
	return snubber.CompareRevisions(ctx, sets, first.Hardest(sets[0]))
}

// compared are the revisions to compare: those named, in that order, or all in scope.
func (s Source) compared(ctx context.Context) ([]store.Revision, error) {
	revs, err := RevisionsInScope(ctx, s.Logbook, s.Scope)
	if err != nil {
		return nil, err
	}
	for _, r := range revs {
		if r.Board != revs[0].Board {
			return nil, fmt.Errorf("comparing revisions: trials of %s and of %s are in scope; name one board with --board", revs[0].Board, r.Board)
		}
	}
	if s.Compare == nil {
		if len(revs) < 2 {
			return nil, fmt.Errorf("comparing revisions: %s %s alone is in scope; it takes two revisions of a board", revs[0].Board, revs[0].Name)
		}
		return revs, nil
	}
	var out []store.Revision
	for _, name := range s.Compare {
		i := slices.IndexFunc(revs, func(r store.Revision) bool { return r.Name == name })
		if i < 0 {
			return nil, fmt.Errorf("comparing revisions: no trial of revision %q of %s is in scope; there are trials of %s", name, revs[0].Board, some(revs))
		}
		out = append(out, revs[i])
	}
	return out, nil
}

func revisionsTable(c *snubber.Comparison) *page.Table {
	t := page.NewTable("Loops by revision",
		page.Label("revision", "revision"), page.Number("trials", quantity.Ratio, "trials"),
		page.Measured("L", quantity.Inductance, "inductance_h"), page.Measured("C", quantity.Capacitance, "capacitance_f"),
		page.Measured("Z0", quantity.Resistance, "impedance_ohm"), page.Measured("r", quantity.Resistance, "resistance_ohm"),
		page.Measured("ring, undamped", quantity.Frequency, "ring_hz"), page.Measured("I0", quantity.Current, "excitation_a"),
		page.Measured("bare peak", quantity.Voltage, "peak_v"))
	for k, r := range c.Revisions {
		row := t.Row(revisionName(c, k), c.Fits[k].Trials, r.Loop.Inductance, r.Loop.Capacitance, r.Loop.Impedance, r.Loop.Resistance, r.Loop.RingHz, r.Excitation, r.Peak)
		for _, x := range c.Fits[k].SetAside {
			row.Note("trial %s was set aside: %s", store.ShortID(x.Trial), x.Because)
		}
	}
	if at := c.Point; at.BusV > 0 {
		point := "at a bus of " + quantity.Format(at.BusV, quantity.Voltage, 4)
		if at.CurrentA > 0 {
			point += " and a load of " + quantity.Format(at.CurrentA, quantity.Current, 4)
		}
		t.Note("I0 and the bare peak are %s, without a probe", point)
	}
	return t
}

// revisionName is a revision, with its board where there are several.
func revisionName(c *snubber.Comparison, k int) string {
	for _, r := range c.Revisions {
		if r.Board != c.Revisions[0].Board {
			return c.Revisions[k].Board + " " + c.Revisions[k].Revision
		}
	}
	return c.Revisions[k].Revision
}

// quantitiesCompared are the quantities of a comparison with their names and units, in the order of the tables.
var quantitiesCompared = []struct {
	json, name string
	unit       quantity.Unit
}{
	{"inductance_h", "L", quantity.Inductance}, {"capacitance_f", "C", quantity.Capacitance}, {"impedance_ohm", "Z0", quantity.Resistance},
	{"resistance_ohm", "r", quantity.Resistance}, {"ring_hz", "ring, undamped", quantity.Frequency},
	{"excitation_a", "I0", quantity.Current}, {"peak_v", "bare peak", quantity.Voltage},
}

func differencesTable(c *snubber.Comparison) *page.Table {
	t := page.NewTable("Differences", page.Label("of", "quantity"), page.Label("from", "from"), page.Label("to", "to"),
		page.Label("difference", "delta"), page.Label("95 % interval", "delta_interval"), page.Label("relative", "relative"), page.Label("more or less", "probability_real"))
	for _, q := range quantitiesCompared {
		for _, d := range c.Differences {
			if d.Quantity != q.json || d.Delta == nil {
				continue
			}
			relative := ""
			if d.Relative != nil {
				relative = fmt.Sprintf("%+.1f %%", 100*d.Relative.Value)
			}
			t.Row(q.name, d.From, d.To, quantity.FormatUncertain(d.Delta.Value, d.Delta.U, q.unit),
				quantity.Format(d.Delta.Low, q.unit, 3)+" to "+quantity.Format(d.Delta.High, q.unit, 3), relative, sureness(d))
		}
	}
	return t
}

// sureness is the probability of a difference's sign, in words that do not claim more digits than it has.
func sureness(d snubber.Difference) string {
	side := "less"
	if d.Delta.Value >= 0 {
		side = "more"
	}
	if d.ProbabilityReal > 0.999 {
		return side + ", > 99.9 %"
	}
	return fmt.Sprintf("%s, %.1f %%", side, 100*d.ProbabilityReal)
}

func sayComparison(p *page.Page, c *snubber.Comparison) {
	if len(c.SharedParts) == 0 {
		p.Say("No part is known to have served on more than one revision: name the same words with `--part`, or one `--session`, where one did, and the differences are known better.")
	} else {
		p.Say("Of the parts, %d served on several revisions; the error of each counts once.", len(c.SharedParts))
	}
	for k, f := range c.Fits {
		for _, w := range f.Warnings {
			p.Warn("%s: %s.", revisionName(c, k), w)
		}
	}
	for _, w := range c.Warnings {
		p.Warn("%s.", w)
	}
}

// revisionsPlot is L and C by revision.
func revisionsPlot(c *snubber.Comparison) *page.Plot {
	var names []string
	var ls, cs []snubber.Estimate
	known := func(e *snubber.Estimate) snubber.Estimate {
		if e == nil {
			return snubber.Estimate{Value: math.NaN()}
		}
		return *e
	}
	for k, r := range c.Revisions {
		names = append(names, revisionName(c, k))
		ls, cs = append(ls, known(r.Loop.Inductance)), append(cs, known(r.Loop.Capacitance))
	}
	p := page.NewPlot("The loop by revision, with 95 % intervals", page.CategoryAxis("revision", "revision", names...),
		page.LinearAxis("inductance L", quantity.Inductance, "inductance_h"))
	p.Estimates("L", nil, ls)
	p.Below(page.LinearAxis("capacitance C", quantity.Capacitance, "capacitance_f")).Estimates("C", nil, cs).Style(1)
	return p
}
