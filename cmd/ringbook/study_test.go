package main

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"ringbook/acquire/simbench"
	"ringbook/snubber"
	"ringbook/snubber/preferred"
)

// A study of the fit on boards the program has never seen, each integrated by the simulated bench, which shares no
// code with the closed forms. An iteration is a board, so that a thousand boards are
//
//	go test ./cmd/ringbook -run '^$' -bench FitStudy -benchtime 1000x
//
// Each board has a loop, an operating point, readings' errors (normal, of the stated size) and part tolerances
// (rectangular) of its own, and 5 to 8 trials; on one board in six one trial is written down with the wrong capacitor.
// Reported, in percent of boards: how often the 95 % intervals hold the truth, how often the mislabelled trial is the one set
// aside, and how often a sound one is.

// studyBoard is one board of the study.
type studyBoard struct {
	cfg        simbench.Config
	trials     []snubber.Trial
	mislabeled string // the id of the trial with the wrong capacitor; "" for none
}

// studyKind is how hard a board is on the fit.
type studyKind struct {
	name     string
	junction float64 // largest share of the node's capacitance that depends on voltage
	fall     float64 // longest fall time, in periods of the bare ring
}

func logBetween(rng *rand.Rand, lo, hi float64) float64 { return lo * math.Pow(hi/lo, rng.Float64()) }

func makeStudyBoard(kind studyKind, seed uint64) (*studyBoard, error) {
	rng := rand.New(rand.NewPCG(seed, 17))
	l, c := logBetween(rng, 3e-9, 60e-9), logBetween(rng, 50e-12, 1e-9)
	z, bus := math.Sqrt(l/c), logBetween(rng, 12, 400)
	period := 2 * math.Pi * math.Sqrt(l*c)
	amps := bus / z * (0.15 + 1.5*rng.Float64())
	cfg := simbench.Default()
	cfg.Board = simbench.Board{Inductance: l, Resistance: z / logBetween(rng, 6, 30), FixedC: c, PerLoadA: 1, Duty: 0.3,
		BodyDrop: 0.8, BodyOhm: 0.02 * z, FallTime: kind.fall * period * rng.Float64()}
	if kind.junction > 0 {
		// c is the capacitance at the bus; a share of it is the junction's there.
		share, phi := kind.junction*rng.Float64(), 0.7
		cfg.Board.FixedC, cfg.Board.JunctionV, cfg.Board.Grading = c*(1-share), phi, 0.3+0.2*rng.Float64()
		cfg.Board.JunctionC = c * share * math.Pow(1+bus/phi, cfg.Board.Grading)
	}
	cfg.BusV, cfg.LoadA, cfg.ProbeF = bus, amps, logBetween(rng, 1e-12, 12e-12)
	cfg.Parts = simbench.Parts{CTol: []float64{0.01, 0.02, 0.05, 0.1}[rng.IntN(4)], RTol: 0.01, DiodeDrop: 0.6, DiodeOhm: 0.1, Seed: seed}
	cfg.Scope = simbench.Scope{RateHz: 60 / period, Points: 6000, Before: 200, NoiseV: 0.002 * bus, SpanV: 4.5 * bus, BottomV: -0.5 * bus}
	cfg.Seed = seed
	model, err := simbench.New(cfg)
	if err != nil {
		return nil, err
	}
	b := &studyBoard{cfg: cfg}
	series, err := preferred.E6.Between(0.4*c, 12*c)
	if err != nil {
		return nil, err
	}
	rng.Shuffle(len(series), func(i, j int) { series[i], series[j] = series[j], series[i] })
	n := 5 + rng.IntN(4)
	wrong := -1
	if rng.IntN(6) == 0 {
		wrong = 1 + rng.IntN(n-1)
	}
	u := [3]float64{logBetween(rng, 0.001, 0.005), logBetween(rng, 0.02, 0.05), logBetween(rng, 0.004, 0.01)}
	for i := range n {
		network := simbench.Network{Kind: simbench.Bare}
		logged := snubber.Network{Kind: snubber.Bare}
		if i > 0 {
			network = simbench.Network{Kind: simbench.C, C: series[i-1]}
			logged = snubber.Network{Kind: snubber.C, C: series[i-1], CTol: cfg.Parts.CTol}
		}
		t := snubber.Trial{ID: fmt.Sprintf("%04d-%d", seed, i), Board: "study", Revision: "1", ProbeC: cfg.ProbeF,
			Point: snubber.OperatingPoint{BusV: bus, CurrentA: amps, SwitchingHz: 100e3}}
		if i == wrong {
			logged.C, err = mislabel(rng, series[i-1])
			if err != nil {
				return nil, err
			}
			b.mislabeled = t.ID
		}
		t.Network = logged
		capture, err := model.Capture(context.Background(), network, seed*100+uint64(i))
		if err != nil {
			return nil, err
		}
		f := capture.Evaluate()
		exact, err := model.Respond(context.Background(), network)
		if err != nil {
			return nil, err
		}
		for k, q := range []snubber.Quantity{snubber.RingHz, snubber.DecayS, snubber.PeakV} {
			v := []float64{f.RingHz, f.DecayS, exact.Peak}[k]
			if math.IsNaN(v) {
				continue
			}
			t.Readings = append(t.Readings, snubber.Reading{Quantity: q, Value: v * (1 + u[k]*rng.NormFloat64()), U: v * u[k]})
		}
		b.trials = append(b.trials, t)
	}
	return b, nil
}

// mislabel is what somebody writes down for a capacitor they took for another: one or two values of the series away, or a
// decade.
func mislabel(rng *rand.Rand, c float64) (float64, error) {
	switch rng.IntN(6) {
	case 0:
		return c * 10, nil
	case 1:
		return c / 10, nil
	case 2, 3:
		return preferred.E6.Above(c * 1.1)
	default:
		return preferred.E6.Below(c / 1.1)
	}
}

func BenchmarkFitStudy(b *testing.B) {
	for _, kind := range []studyKind{
		{name: "linear"},
		{name: "fall", fall: 0.3},
		{name: "junction", junction: 0.5},
		{name: "junction-and-fall", junction: 0.5, fall: 0.3},
	} {
		b.Run(kind.name, func(b *testing.B) { fitStudy(b, kind) })
	}
}

func fitStudy(b *testing.B, kind studyKind) {
	var boards, l, c, z, r, wrong, found, sound, widened, failed, bias float64
	holds := func(e *snubber.Estimate, truth float64) float64 {
		if e != nil && e.Low <= truth && truth <= e.High {
			return 1
		}
		return 0
	}
	for b.Loop() {
		boards++
		s, err := makeStudyBoard(kind, uint64(boards))
		if err != nil {
			b.Fatal(err)
		}
		f, err := snubber.Fit(context.Background(), s.trials)
		if err != nil {
			failed++
			b.Logf("board %g: %v", boards, err)
			continue
		}
		l += holds(f.Loop.Inductance, s.cfg.Board.Inductance)
		c += holds(f.Loop.Capacitance, s.cfg.Board.CapacitanceAt(s.cfg.BusV))
		z += holds(f.Loop.Impedance, math.Sqrt(s.cfg.Board.Inductance/s.cfg.Board.CapacitanceAt(s.cfg.BusV)))
		r += holds(f.Loop.Resistance, s.cfg.Board.Resistance)
		bias += f.Loop.Capacitance.Value/s.cfg.Board.CapacitanceAt(s.cfg.BusV) - 1
		if len(f.Warnings) > 0 {
			widened++
		}
		if s.mislabeled != "" {
			wrong++
		}
		falseAlarm := false
		for _, a := range f.SetAside {
			if a.Trial == s.mislabeled {
				found++
			} else {
				falseAlarm = true
			}
		}
		if falseAlarm {
			sound++
		}
	}
	for _, m := range []struct {
		share float64
		name  string
	}{{l / boards, "L-held"}, {c / boards, "C-held"}, {z / boards, "Z0-held"}, {r / boards, "r-held"}, {found / wrong, "wrong-found"}, {sound / boards, "sound-lost"}, {widened / boards, "warned"}, {failed / boards, "failed"}, {bias / boards, "C-bias"}} {
		b.ReportMetric(100*m.share, m.name+"-%")
	}
}

// A study of the choice on the same boards: a limit is drawn between the bus and the bare peak, the trials are fitted, a
// network is recommended, and its parts are tried at the corners of their tolerances on the board itself, integrated. An
// iteration is a board:
//
//	go test ./cmd/ringbook -run '^$' -bench ChoiceStudy -benchtime 500x
//
// Reported: the share of boards on which every corner keeps the limit, for the choice and for the rule of thumb; how many
// times larger the capacitor is than the smallest of the series with which any resistor would have kept it on that board;
// and the time from trials to choice.
func BenchmarkChoiceStudy(b *testing.B) {
	for _, kind := range choiceKinds {
		b.Run(kind.name, func(b *testing.B) { choiceStudy(b, kind) })
	}
}

var choiceKinds = []studyKind{
	{name: "linear"},
	{name: "junction-and-fall", junction: 0.5, fall: 0.3},
}

const (
	studyCTol  = 0.05
	studyRTol  = 0.01
	studyDraws = 2000
)

// choiceCase is a board with the limit its peak must keep.
type choiceCase struct {
	seed  uint64
	s     *studyBoard
	board *simbench.Model // without a probe, with parts that are what they say
	limit float64         // V
}

func makeChoiceCase(b *testing.B, kind studyKind, seed uint64) *choiceCase {
	s, err := makeStudyBoard(kind, seed)
	if err != nil {
		b.Fatal(err)
	}
	cfg := s.cfg
	cfg.ProbeF, cfg.Parts.CTol, cfg.Parts.RTol = 0, 0, 0
	board, err := simbench.New(cfg)
	if err != nil {
		b.Fatal(err)
	}
	bare, err := board.Respond(context.Background(), simbench.Network{Kind: simbench.Bare})
	if err != nil {
		b.Fatal(err)
	}
	rng := rand.New(rand.NewPCG(seed, 23))
	return &choiceCase{seed: seed, s: s, board: board, limit: cfg.BusV + (0.4+0.4*rng.Float64())*(bare.Peak-cfg.BusV)}
}

// choose goes from the trials to the choice, and says how long it took.
func (x *choiceCase) choose(b *testing.B) (*snubber.Recommendation, time.Duration) {
	ctx := context.Background()
	began := time.Now()
	fit, err := snubber.Fit(ctx, x.s.trials)
	if err != nil {
		b.Fatal(err)
	}
	ahead, _, err := fit.Ahead(fit.Hardest(x.s.trials), studyDraws, 1)
	if err != nil {
		b.Fatal(err)
	}
	rec, err := snubber.Recommend(ctx, ahead, snubber.Limits{MaxPeak: x.limit, SwitchingHz: 100e3, CTol: studyCTol, RTol: studyRTol})
	if err != nil {
		b.Fatal(err)
	}
	return rec, time.Since(began)
}

// keeps says whether the board itself keeps the limit with the parts at every corner of their tolerances.
func (x *choiceCase) keeps(b *testing.B) func(c, r float64) bool {
	return func(c, r float64) bool {
		for _, dc := range []float64{1 - studyCTol, 1 + studyCTol} {
			for _, dr := range []float64{1 - studyRTol, 1 + studyRTol} {
				y, err := x.board.Respond(context.Background(), simbench.Network{Kind: simbench.RC, C: c * dc, R: r * dr})
				if err != nil {
					b.Fatal(err)
				}
				if y.Peak > x.limit {
					return false
				}
			}
		}
		return true
	}
}

func choiceStudy(b *testing.B, kind studyKind) {
	var boards, unmet, held, thumb, thumbLarger float64
	var ratios []float64
	var spent time.Duration
	for b.Loop() {
		boards++
		x := makeChoiceCase(b, kind, uint64(boards))
		rec, took := x.choose(b)
		spent += took
		if !rec.Met {
			unmet++
			continue
		}
		keeps := x.keeps(b)
		if keeps(rec.Choice.C, rec.Choice.R) {
			held++
		} else {
			b.Logf("board %d: limit %.4g V, chosen %.3g ohm %.3g F, predicted %+v worst %.4g", x.seed, x.limit, rec.Choice.R, rec.Choice.C, *rec.Choice.Peak, rec.Choice.WorstV)
		}
		if keeps(rec.RuleOfThumb.C, rec.RuleOfThumb.R) {
			thumb++
		}
		smallest := smallestThatKeeps(b, rec.Choice.C, rec.Choice.R, keeps)
		ratios = append(ratios, rec.Choice.C/smallest)
		thumbLarger += rec.RuleOfThumb.C / smallest
	}
	met := boards - unmet
	b.ReportMetric(100*held/met, "held-%")
	b.ReportMetric(100*thumb/met, "thumb-held-%")
	b.ReportMetric(quantile(ratios, 0.5), "C-ratio-median")
	b.ReportMetric(quantile(ratios, 0.9), "C-ratio-p90")
	b.ReportMetric(thumbLarger/met, "thumb-C-ratio-mean")
	b.ReportMetric(100*unmet/boards, "unmet-%")
	b.ReportMetric(spent.Seconds()/boards*1e3, "ms-to-choice")
}

// smallestThatKeeps walks down the E12 series from the choice as long as some resistor of E24 near its own keeps the limit,
// or up where the choice does not.
func smallestThatKeeps(b *testing.B, from, ohms float64, keeps func(c, r float64) bool) float64 {
	any := func(c float64) bool {
		// The best resistor goes about as C^-0.4 in this range; the neighbours on both sides are tried.
		r := ohms * math.Pow(from/c, 0.4)
		rs, err := preferred.E24.Between(r*0.6, r*1.7)
		if err != nil {
			b.Fatal(err)
		}
		for _, r := range rs {
			if keeps(c, r) {
				return true
			}
		}
		return false
	}
	c := from
	for range 12 {
		if any(c) {
			break
		}
		next, err := preferred.E12.Above(c * 1.05)
		if err != nil {
			b.Fatal(err)
		}
		c = next
	}
	for range 12 {
		next, err := preferred.E12.Below(c / 1.05)
		if err != nil {
			b.Fatal(err)
		}
		if !any(next) {
			return c
		}
		c = next
	}
	return c
}
