package main

import (
	"context"
	"time"

	"ringbook/acquire"
	"ringbook/recipes"
	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/snubber/waveform"
	"ringbook/store"

	"github.com/spf13/cobra"
)

// substituteFlags say what a series is of, and how it goes.
type substituteFlags struct {
	board, revision, session, note string
	rig, drawer, answers           string
	probe                          quantity.Farad
	tol                            quantity.Fraction
	bus, safe                      quantity.Volt
	current                        quantity.Ampere
	hz                             quantity.Hertz
	within                         time.Duration
	waveform, unattended, all      bool
	captures                       int
}

func substituteCommand(a *app) *cobra.Command {
	s := substituteFlags{safe: 5, within: 30 * time.Second, captures: 1}
	cmd := &cobra.Command{
		Use:   "substitute",
		Short: "The guided series: fit, read, log, fit again, suggest the next capacitor",
		Long: `substitute leads through a capacitor-substitution series: the node bare, then one capacitor after another, each the
one whose trial would tell most next, until another would not be worth the soldering.

Before each swap the supply is switched off and the bus read back until it is below --safe-v; where no instrument of the
rig switches the supply, you are asked to. Then you fit the part and press Enter. Supply on, readings, supply off; the
trial is on the disk before you are asked anything else. A reading that the other trials contradict is asked about while
the part is still in your hand.

At a question type Enter, or what was fitted instead (330p, 330p 2%, a name in the drawer, bare), or again, skip, done.
What is typed before the question stands there is thrown away, so that no key pressed too early takes a part as fitted.
--answers reads them from a file, one a line, whose end means done. --unattended asks nothing: the rig switches every part
of the drawer.

Ctrl-C switches the supply off; what was logged stands. The same command then goes on where it stopped: what was read in
the session is not asked for again.`,
		Example: `  ringbook substitute --board winch-drive --revision B --session monday --probe-c 3p9 --drawer drawer.toml
  ringbook substitute --board winch-drive --revision B --c-tol 5% --waveform --captures 8
  ringbook substitute --board winch-drive --revision B --drawer relays.toml --unattended --all --json`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) error { return a.substitute(cmd, &s) },
	}
	f := cmd.Flags()
	f.StringVar(&s.board, "board", "", "the board's `NAME`")
	f.StringVar(&s.revision, "revision", "", "the board revision's `NAME`")
	f.StringVar(&s.session, "session", "", "`NAME` of the sitting at the bench; what was read in it is not asked for again")
	f.StringVar(&s.rig, "rig", "rig.toml", "`FILE` with the instruments and what to ask of them")
	f.StringVar(&s.drawer, "drawer", "", "`FILE` with the parts on hand; without it the E6 series")
	f.StringVar(&s.answers, "answers", "", "`FILE` with an answer a line, instead of the keyboard")
	f.Var(&s.probe, "probe-c", "the probe's capacitance across the node while reading")
	f.Var(&s.tol, "c-tol", "tolerance of a capacitor that is in no drawer, such as 5%")
	f.Var(&s.bus, "bus-v", "bus voltage, where no instrument reads it")
	f.Var(&s.current, "current-a", "load current, where no instrument reads it")
	f.Var(&s.hz, "switching-hz", "switching frequency, where no instrument reads it")
	f.Var(&s.safe, "safe-v", "bus voltage below which parts may be swapped")
	f.DurationVar(&s.within, "discharge-within", s.within, "longest `TIME` the bus may take to fall below that")
	f.BoolVar(&s.waveform, "waveform", false, "capture the edge's samples too, log them, and read the ring from them")
	f.IntVar(&s.captures, "captures", s.captures, "`NUMBER` of captures to average")
	f.BoolVar(&s.unattended, "unattended", false, "ask nobody: the rig switches every part")
	f.BoolVar(&s.all, "all", false, "read every capacitor, enough or not")
	f.StringVar(&s.note, "note", "", "`WORDS` to remember with each trial")
	return cmd
}

// check says what the flags cannot mean together.
func (s *substituteFlags) check(cmd *cobra.Command) error {
	switch {
	case s.board == "" || s.revision == "":
		return usagef("a series needs --board and --revision")
	case s.captures < 1 || s.captures > mostCaptures:
		return usagef("--captures %d: it must be 1 to %d", s.captures, mostCaptures)
	case !s.waveform && cmd.Flags().Changed("captures"):
		return usagef("--captures %d is given without --waveform: add it, or leave --captures out", s.captures)
	case s.safe == 0:
		return usagef("--safe-v 0: no bus ever reads less; give what may be touched, such as 5V")
	case s.within <= 0:
		return usagef("--discharge-within %s: it must be longer than nothing", s.within)
	case s.tol >= 1:
		return usagef("--c-tol %v: a part of that tolerance may be nothing at all; write for example 5%%", s.tol)
	case s.unattended && s.answers != "":
		return usagef("--unattended asks nothing, and --answers %s answers: leave one out", s.answers)
	}
	return nil
}

func (a *app) substitute(cmd *cobra.Command, s *substituteFlags) (err error) {
	if err := s.check(cmd); err != nil {
		return err
	}
	ctx, done := untilHangup(cmd.Context())
	defer done()
	rig, err := acquire.LoadRig(s.rig)
	if err != nil {
		return err
	}
	series := &acquire.Series{
		Tol: float64(s.tol), All: s.all, Unattended: s.unattended, SafeV: float64(s.safe), Within: s.within, Usual: s.usual,
		Trial: snubber.Trial{Board: s.board, Revision: s.revision, Session: s.session, Note: s.note, ProbeC: float64(s.probe),
			Point: snubber.OperatingPoint{BusV: float64(s.bus), CurrentA: float64(s.current), SwitchingHz: float64(s.hz)}},
	}
	if s.drawer != "" {
		drawer, err := acquire.LoadDrawer(s.drawer)
		if err == nil {
			err = rig.Serves(drawer)
		}
		if err != nil {
			return err
		}
		if series.Drawer = drawer.Capacitors; len(series.Drawer) == 0 {
			return noPart(s.drawer, "capacitor", "C1")
		}
	}
	var ask *asker
	if !s.unattended {
		if ask, err = a.newAsker(s.answers); err != nil {
			return err
		}
		defer ask.close()
	}
	lb, err := a.open(ctx)
	if err != nil {
		return err
	}
	defer closing(lb, &err)
	src := recipes.Source{Logbook: lb, Scope: store.Scope{Board: s.board, Revision: s.revision}}
	if series.Drawer != nil {
		src.OnHand, _ = valuesOf(series.Drawer)
	}
	if series.Past, err = src.Trials(ctx); err != nil {
		return err
	}
	station, err := acquire.Open(ctx, rig)
	if err != nil {
		return once(err)
	}
	defer station.Close()
	series.Bench = station
	return a.runSeries(ctx, series, station, ask, src, s)
}

// runSeries runs a series and says what it came to.
func (a *app) runSeries(ctx context.Context, series *acquire.Series, station *acquire.Station, ask *asker, src recipes.Source, s *substituteFlags) error {
	captures := 0
	if s.waveform {
		captures = s.captures
	}
	show := &seriesView{app: a, unattended: s.unattended, noticed: map[string]bool{}}
	series.Tell = show.tell
	station.Notify(show.notice)
	if ask != nil {
		series.Ask = func(ctx context.Context, q acquire.Question) (string, error) { return ask.ask(ctx, show, q) }
	}
	series.Take = func(ctx context.Context, t snubber.Trial) (snubber.Trial, []waveform.Record, []string, error) {
		return a.readTrial(ctx, station, t, captures, show.read)
	}
	series.Log, series.Strike = src.Logbook.AddWithWaveforms, src.Logbook.Strike
	show.begin(series, station.CanSwitch())
	result, err := series.Run(ctx)
	show.end(result, err)
	if err != nil {
		return once(err)
	}
	if a.json {
		return a.printJSON(seriesJSON(result))
	}
	p := page.New("Series of " + s.board + " " + s.revision)
	switch {
	case result.Fit != nil:
		err = recipes.Substitution(ctx, p, src)
	case len(series.Past)+len(result.Trials) > 0:
		err = recipes.Trials(ctx, p, src)
		p.Say("The trials do not give the loop yet: %v.", result.FitErr)
	}
	if err == nil && result.Fit != nil && readsSupply(result.Trials) {
		err = recipes.Watts(ctx, p, src)
	}
	if err != nil {
		return err
	}
	p.Say("The series ended: %s.", result.Ended)
	return a.print(p)
}

func readsSupply(trials []snubber.Trial) bool {
	for _, t := range trials {
		_, amps := t.Reading(snubber.SupplyA)
		if amps && t.Struck == "" && t.Operating().BusV > 0 {
			return true
		}
	}
	return false
}

func seriesJSON(r acquire.SeriesResult) any {
	trials := []any{}
	for _, t := range r.Trials {
		trials = append(trials, trialJSON(t))
	}
	answer := map[string]any{"trials": trials, "resumed": r.Resumed, "ended": r.Ended, "enough": r.Enough, "fit": r.Fit, "fit_error": nil}
	if r.FitErr != nil {
		answer["fit_error"] = r.FitErr.Error()
	}
	return answer
}
