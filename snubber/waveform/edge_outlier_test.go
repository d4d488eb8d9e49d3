package waveform_test

import (
	"math/rand/v2"
	"strings"
	"testing"
)

// Records that were once read wrong, or less well than they allow; each holds its cause. All have one edge, and the fit must begin
// at it and use the ring to where it dies.
func TestEdgeOutliers(t *testing.T) {
	for _, c := range []struct {
		name  string
		m     made
		seeds int
	}{
		{"noise in a ring of many cycles poses as an edge", made{hz: 10e6, q: 30, amp: 1, phi: 1.28, to: 1.5, perCycle: 21.3, before: 200, n: 2700, noise: 0.0446}, 100},
		{"noise before the ring poses as an edge", made{hz: 10e6, q: 12, amp: 1, phi: 2.9, perCycle: 15, before: 1000, n: 2000, noise: 0.06}, 60},
		{"a jump into a swing that is larger", made{hz: 10e6, q: 12, amp: 1, phi: 2.76, perCycle: 6.3, before: 1000, n: 1340, noise: 0.0646}, 60},
		{"a second tone that could stand for the first", made{hz: 10e6, q: 15, amp: 1, phi: 4.5, to: 1.2, perCycle: 14, n: 575, noise: 0.0183,
			second: []made{{hz: 24e6, q: 9, amp: 0.077, phi: 5.8}}}, 60},
	} {
		late, edges, missed := 0, 0, 0
		for seed := range c.seeds {
			r, edge := c.m.record(rand.New(rand.NewPCG(uint64(seed), 31)))
			e := readEdge(t, r)
			if !e.Ringing || e.DecayS == nil {
				missed++
				continue
			}
			_, d := c.m.rate()
			within(t, c.name+": ring_hz", e.RingHz, c.m.hz, 5, 0.01)
			within(t, c.name+": decay_s", e.DecayS, 1/d, 5, 0.2)
			if e.FitFrom-edge > 1/c.m.hz || e.FitTo-edge < min(3/d, r.TimeAt(len(r.Volts)-2)) {
				late++
			}
			if strings.Contains(strings.Join(e.Warnings, ""), "edges in the record") {
				edges++
			}
		}
		t.Logf("%s: %d missed, %d late, %d with other edges", c.name, missed, late, edges)
		if missed > 0 || late > 0 || edges > 0 {
			t.Errorf("%s: of %d, %d missed, %d late, %d with other edges", c.name, c.seeds, missed, late, edges)
		}
	}
}
