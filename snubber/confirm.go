package snubber

import (
	"errors"
	"fmt"
	"math"
)

// Confirmation is a prediction of the peak beside what was then measured.
type Confirmation struct {
	Network   Kind      `json:"network"`
	R         float64   `json:"r_ohm"`
	C         float64   `json:"c_f"`
	Predicted *Estimate `json:"predicted_v"` // V
	Measured  *Estimate `json:"measured_v"`  // V: the weighted mean of the trials' peaks
	Trials    []string  `json:"trials"`      // those that measured it
	LimitV    float64   `json:"limit_v"`     // V
	Agrees    bool      `json:"agrees"`      // the two differ by no more than their 95 % interval
	Keeps     bool      `json:"keeps"`       // the peak measured stays under the limit
}

// Confirm compares the peak predicted for a choice with the peaks of the trials that fitted it. The difference of the
// two is judged by its own 95 % interval, from both standard uncertainties (GUM 5.1.2).
func Confirm(c *Choice, limit float64, trials []Trial) (*Confirmation, error) {
	out := &Confirmation{Network: c.Network, R: c.R, C: c.C, Predicted: c.Peak, LimitV: limit, Trials: []string{}}
	var sum, weight float64
	for _, t := range trials {
		peak, ok := t.Reading(PeakV)
		if !ok || t.Struck != "" || t.Network.Kind != c.Network || !same(t.Network.C, c.C) || !same(t.Network.R, c.R) {
			continue
		}
		u := peak.U
		if u == 0 {
			u = unstatedPeak * peak.Value
		}
		sum += peak.Value / (u * u)
		weight += 1 / (u * u)
		out.Trials = append(out.Trials, t.ID)
	}
	if weight == 0 {
		return nil, fmt.Errorf("confirming %s of %g ohm and %g F: %w", c.Network, c.R, c.C, errors.New("no trial fitted it and read its peak; fit it and take one"))
	}
	out.Measured = estimate(sum/weight, 1/math.Sqrt(weight), normal95)
	diff := math.Abs(out.Measured.Value - c.Peak.Value)
	out.Agrees = diff <= normal95*math.Hypot(out.Measured.U, c.Peak.U)
	out.Keeps = out.Measured.Value <= limit
	return out, nil
}

// same says whether two nominal values are one, whatever way they were written.
func same(a, b float64) bool { return math.Abs(a-b) <= 1e-9*math.Max(math.Abs(a), math.Abs(b)) }
