package snubber

import (
	"context"
	"fmt"
	"math"

	"ringbook/snubber/leastsq"
)

// PlainFit is the least squares alone from a given start (L, C, r, I0), without the search for a start and the test of each
// trial: what another program's least squares is to be compared with.
func PlainFit(trials []Trial, start [4]float64) (l float64, err error) {
	obs, err := observe(trials)
	if err != nil {
		return 0, err
	}
	m := newModel(obs)
	all := make([]int, len(obs.list))
	for i := range all {
		all[i] = i
	}
	p := []float64{math.Log(start[0]*start[1]) / 2, math.Log(start[0]/start[1]) / 2, math.Log(start[2]), start[3]}
	fit, err := m.fit(context.Background(), all, p, nil)
	if err != nil {
		return 0, err
	}
	if fit.Status != leastsq.Converged {
		return 0, fmt.Errorf("%v: %s", fit.Status, fit.Reason)
	}
	return m.loop(fit.P).Inductance, nil
}
