package main

import (
	"context"
	"fmt"
	"os"
	"path/filepath"

	"ringbook/acquire"
	"ringbook/acquire/simbench"
	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"

	"github.com/spf13/cobra"
)

// The invented scenario: the motor drive of a tide gate's winch, second revision.
const (
	demoBoard      = "tide-gate winch"
	demoRevision   = "B"
	demoFormer     = "A" // whose loop was longer
	demoFormerLoop = 1.45
	demoRating     = 100.0   // V
	demoProbe      = 3.9e-12 // F
	demoCaptures   = 4       // of the edge, averaged
)

// demoSeries is the bag of capacitors; 0 is the bare node.
var demoSeries = [...]float64{0, 100e-12, 220e-12, 470e-12, 1e-9, 2.2e-9}

const (
	demoCTol = 0.05
	demoRTol = 0.01
)

func demoCommand(a *app) *cobra.Command {
	return &cobra.Command{
		Use:   "demo",
		Short: "The whole job on a simulated bench over TCP: about ten seconds, no hardware",
		Long: `demo serves a simulated bench on the loopback interface, runs a capacitor-substitution series on it, fits the loop,
recommends a network, fits that network, and holds the peak it then measures against the prediction. The logbook goes
to a new folder unless --logbook names a file. The pages of the lab notebook are woven from it and left beside it.`,
		Example: `  ringbook demo
  ringbook demo --logbook demo.db --json`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) (err error) {
			if !cmd.Flags().Changed("logbook") {
				dir, err := os.MkdirTemp("", "ringbook-demo-")
				if err != nil {
					return fmt.Errorf("demo: a folder for its logbook: %w", err)
				}
				a.logbook = filepath.Join(dir, "demo.db")
			}
			ctx := cmd.Context()
			lb, err := a.open(ctx)
			if err != nil {
				return err
			}
			defer closing(lb, &err)
			d := &demo{app: a, lb: lb}
			if err := d.formerRevision(ctx); err != nil {
				return err
			}
			cfg := demoBench()
			if d.bench, err = simbench.Start(ctx, cfg); err != nil {
				return err
			}
			defer d.bench.Close()
			return d.run(ctx)
		},
	}
}

func demoBench() simbench.Config {
	cfg := simbench.Default()
	cfg.ProbeF, cfg.Parts.CTol, cfg.Parts.RTol = demoProbe, demoCTol, demoRTol
	return cfg
}

// formerRevision reads the board as it was before its loop was shortened, with the same bag of capacitors.
func (d *demo) formerRevision(ctx context.Context) (err error) {
	cfg := demoBench()
	cfg.Board.Inductance *= demoFormerLoop
	if d.bench, err = simbench.Start(ctx, cfg); err != nil {
		return err
	}
	defer d.bench.Close()
	if err := d.open(ctx, demoFormer); err != nil {
		return err
	}
	defer d.station.Close()
	return d.series(ctx, demoSeries[:5])
}

// demo is one run of the demonstration.
type demo struct {
	*app
	lb       *store.Logbook
	bench    *simbench.Bench
	revision string // under test
	station  *acquire.Station
}

// open puts a revision on file and opens the rig of its bench. The caller closes the station.
func (d *demo) open(ctx context.Context, revision string) error {
	if err := d.lb.AddBoard(ctx, store.Board{Name: demoBoard, DeviceV: demoRating, Revisions: []store.Revision{{Name: revision}}}); err != nil {
		return err
	}
	rig, err := acquire.ParseRig("the simulated bench", []byte(d.bench.RigTOML()))
	if err != nil {
		return err
	}
	d.revision = revision
	d.station, err = acquire.Open(ctx, rig)
	return err
}

// series reads the bare node and each capacitor.
func (d *demo) series(ctx context.Context, caps []float64) error {
	for _, c := range caps {
		n := snubber.Network{Kind: snubber.Bare}
		if c > 0 {
			n = snubber.Network{Kind: snubber.C, C: c, CTol: demoCTol}
		}
		if err := d.trial(ctx, n); err != nil {
			return err
		}
	}
	return nil
}

func (d *demo) run(ctx context.Context) error {
	if err := d.open(ctx, demoRevision); err != nil {
		return err
	}
	defer d.station.Close()
	if err := d.series(ctx, demoSeries[:]); err != nil {
		return err
	}
	src := recipes.Source{Logbook: d.lb, Scope: store.Scope{Board: demoBoard, Revision: demoRevision},
		Limits: recipes.Request{Limits: snubber.Limits{CTol: demoCTol, RTol: demoRTol}}}
	fit, rec, err := recipes.Recommendation(ctx, src)
	if err != nil {
		return err
	}
	var proof *recipes.Confirmation
	if rec.Met {
		if proof, err = d.prove(ctx, src, fit, rec); err != nil {
			return err
		}
	}
	if err := d.report(ctx, src, fit, rec, proof); err != nil {
		return err
	}
	if proof == nil || !proof.Confirmed {
		return errNo
	}
	return nil
}

// prove logs the recommendation, fits it on the bench, and holds the peak it then measures against the prediction.
func (d *demo) prove(ctx context.Context, src recipes.Source, fit *snubber.FitResult, rec *snubber.Recommendation) (*recipes.Confirmation, error) {
	id, _, err := recipes.Decide(ctx, src, fit, rec)
	if err != nil {
		return nil, err
	}
	decision, err := d.lb.Decision(ctx, id)
	if err != nil {
		return nil, err
	}
	if err := d.trial(ctx, decision.Network); err != nil {
		return nil, err
	}
	return recipes.Confirm(ctx, src, decision)
}

// trial fits a network on the bench, reads it and logs it.
func (d *demo) trial(ctx context.Context, n snubber.Network) error {
	t, records, _, err := d.take(ctx, d.station, snubber.Trial{Board: demoBoard, Revision: d.revision, Session: "demonstration", Network: n, ProbeC: demoProbe}, demoCaptures)
	if err != nil {
		return err
	}
	id, err := d.lb.AddWithWaveforms(ctx, t, records)
	if err != nil {
		return err
	}
	line := fmt.Sprintf("%s  fitted %-12s", d.revision, describe(n))
	for _, x := range []struct {
		q    snubber.Quantity
		name string
		unit quantity.Unit
	}{{snubber.RingHz, "ring", quantity.Frequency}, {snubber.PeakV, "peak", quantity.Voltage}} {
		if r, ok := t.Reading(x.q); ok {
			line += fmt.Sprintf("  %s %s", x.name, quantity.FormatUncertain(r.Value, r.U, x.unit))
		}
	}
	d.progress("%s  logged as %s", line, store.ShortID(id))
	return nil
}

func (d *demo) report(ctx context.Context, src recipes.Source, fit *snubber.FitResult, rec *snubber.Recommendation, proof *recipes.Confirmation) error {
	hidden := d.bench.Truth()
	pages, err := d.pages(ctx, src)
	if err != nil {
		return err
	}
	if d.json {
		return d.printJSON(map[string]any{"pages": pages, "fit": fit, "recommendation": rec, "confirmation": proof, "logbook": d.lb.Path(),
			"hidden": map[string]float64{"inductance_h": hidden.Inductance, "capacitance_f": hidden.CapacitanceBus, "resistance_ohm": hidden.Resistance, "excitation_a": hidden.Apparent}})
	}
	loop := page.New("The loop of " + demoBoard + " " + demoRevision)
	if err := recipes.Substitution(ctx, loop, src); err != nil {
		return err
	}
	choice := page.New("What to fit")
	recipes.ChoicePage(choice, fit, rec)
	verdict := page.New("Prediction and measurement")
	if proof != nil {
		recipes.ProofFigures(verdict, proof)
	} else {
		verdict.Say("Nothing was fitted, so nothing is measured.")
	}
	history := page.New("History")
	if err := recipes.History(ctx, history, src); err != nil {
		return err
	}
	truth := page.New("What was hidden on the board")
	truth.Figures(
		page.Figure{Name: "loop inductance", CSV: "inductance_h", Unit: quantity.Inductance, Value: hidden.Inductance},
		page.Figure{Name: "node capacitance at the bus", CSV: "capacitance_f", Unit: quantity.Capacitance, Value: hidden.CapacitanceBus},
		page.Figure{Name: "the same over the whole swing", CSV: "capacitance_average_f", Unit: quantity.Capacitance, Value: hidden.CapacitanceAvg, Remark: "it falls with voltage"},
		page.Figure{Name: "loop resistance", CSV: "resistance_ohm", Unit: quantity.Resistance, Value: hidden.Resistance},
		page.Figure{Name: "excitation", CSV: "excitation_a", Unit: quantity.Current, Value: hidden.Apparent, Remark: "as a switch that lets go at once would have it"},
	)
	for _, p := range []*page.Page{loop, choice, verdict, history, truth} {
		if err := d.print(p); err != nil {
			return err
		}
		if err := d.say(""); err != nil {
			return err
		}
	}
	if err := d.say("The logbook is %s\nLook on with: ringbook history --logbook %q\n\nIts pages, woven from it:", d.lb.Path(), d.lb.Path()); err != nil {
		return err
	}
	for _, name := range pages {
		if err := d.say("  %s", name); err != nil {
			return err
		}
	}
	return nil
}
