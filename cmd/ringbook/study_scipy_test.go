package main

import (
	"math"
	"sort"
	"testing"
	"time"

	"ringbook/snubber"
	"ringbook/snubber/scipytest"
)

// The choice beside a plain script of NumPy and SciPy (testdata/choice.py), which fits the same trials, sets aside what does
// not belong and proves its choice at the same corners with as many draws. An iteration is a board:
//
//	go test ./cmd/ringbook -run '^$' -bench ChoiceAgainstSciPy -benchtime 40x
//
// First ours takes all the boards in turn, then the script does, so that the machine is in the same state for both; the time is
// from the trials to the choice, the least of three, without Python's start and imports. Ours uses two cores, the script
// one. Reported: the median time of each, the median over
// the boards of how many times faster ours is, and for each how often every corner keeps the limit and how much larger the
// capacitor is than the smallest that would have done.
func BenchmarkChoiceAgainstSciPy(b *testing.B) {
	for _, kind := range choiceKinds {
		b.Run(kind.name, func(b *testing.B) { choiceAgainstSciPy(b, kind) })
	}
}

// studyRepeats is how often each choice is timed.
const studyRepeats = 3

// chosen is a choice for one board, with what it cost.
type chosen struct {
	R, C    float64
	Met     bool
	Seconds float64
}

func choiceAgainstSciPy(b *testing.B, kind studyKind) {
	var cases []*choiceCase
	var boards []any
	for b.Loop() {
		x := makeChoiceCase(b, kind, uint64(len(cases)+1))
		cases, boards = append(cases, x), append(boards, scipyBoard(b, x))
	}
	var ours, theirs []chosen
	for _, x := range cases {
		least := math.Inf(1)
		var rec *snubber.Recommendation
		for range studyRepeats {
			var spent time.Duration
			rec, spent = x.choose(b)
			least = min(least, spent.Seconds())
		}
		ours = append(ours, chosen{R: rec.Choice.R, C: rec.Choice.C, Met: rec.Met, Seconds: least})
	}
	scipytest.Run(b, "testdata/choice.py", boards, &theirs)
	if len(theirs) != len(ours) {
		b.Fatalf("the script answers %d boards of %d", len(theirs), len(ours))
	}
	var faster, smallest []float64
	for i, x := range cases {
		faster = append(faster, theirs[i].Seconds/ours[i].Seconds)
		smallest = append(smallest, smallestThatKeeps(b, ours[i].C, ours[i].R, x.keeps(b)))
	}
	reportChosen(b, "ours", cases, ours, smallest)
	reportChosen(b, "SciPy", cases, theirs, smallest)
	b.ReportMetric(quantile(faster, 0.5), "times-faster")
	b.ReportMetric(0, "ns/op") // making a board is of no interest
}

// reportChosen tries the answers at their corners on the boards themselves.
func reportChosen(b *testing.B, name string, cases []*choiceCase, answers []chosen, smallest []float64) {
	var seconds, ratios []float64
	var held float64
	for i, y := range answers {
		seconds = append(seconds, y.Seconds)
		if !y.Met {
			b.Logf("board %d: %s finds nothing under %.4g V", cases[i].seed, name, cases[i].limit)
			continue
		}
		ratios = append(ratios, y.C/smallest[i])
		if cases[i].keeps(b)(y.C, y.R) {
			held++
		} else {
			b.Logf("board %d: %s chooses %.3g ohm %.3g F, which does not keep %.4g V", cases[i].seed, name, y.R, y.C, cases[i].limit)
		}
	}
	met := float64(len(ratios))
	b.ReportMetric(1e3*quantile(seconds, 0.5), name+"-ms-to-choice")
	b.ReportMetric(100*held/met, name+"-held-%")
	b.ReportMetric(quantile(ratios, 0.5), name+"-C-ratio-median")
	b.ReportMetric(quantile(ratios, 0.9), name+"-C-ratio-p90")
	b.ReportMetric(100*(1-met/float64(len(answers))), name+"-unmet-%")
}

// scipyBoard is what the script is told of a board: the trials as they are logged, and the limit.
func scipyBoard(b *testing.B, x *choiceCase) any {
	var rows [][]any
	for _, t := range x.s.trials {
		if t.Network.Kind != snubber.Bare && t.Network.Kind != snubber.C {
			b.Fatalf("trial %s has a network of kind %s, which the script does not know", t.ID, t.Network.Kind)
		}
		row := []any{t.Network.C, t.Network.CTol, t.ProbeC}
		for _, q := range []snubber.Quantity{snubber.RingHz, snubber.DecayS, snubber.PeakV} {
			if r, ok := t.Reading(q); ok {
				row = append(row, r.Value, r.U)
			} else {
				row = append(row, nil, nil)
			}
		}
		rows = append(rows, row)
	}
	return map[string]any{"bus": x.s.cfg.BusV, "limit": x.limit, "ctol": studyCTol, "rtol": studyRTol, "draws": studyDraws, "repeats": studyRepeats, "trials": rows}
}

// quantile of unsorted values, the upper of two between which it falls.
func quantile(x []float64, q float64) float64 {
	x = append([]float64(nil), x...)
	sort.Float64s(x)
	return x[min(len(x)-1, int(q*float64(len(x))))]
}
