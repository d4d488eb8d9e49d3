package snubber

import (
	"errors"
	"fmt"
	"math"
)

// Prediction is what was said of a network before it was tried, and for which loop it was said.
type Prediction struct {
	Network    Network
	Loop       Loop
	Excitation Excitation
	Peak       Estimate // V
	LimitV     float64  // V: the peak it is to stay under
}

// Confirmation is a prediction of the peak beside what was then measured.
type Confirmation struct {
	Network   Kind      `json:"network"`
	R         float64   `json:"r_ohm"`
	C         float64   `json:"c_f"`
	Predicted *Estimate `json:"predicted_v"` // V: on the board as it is
	Measured  *Estimate `json:"measured_v"`  // V: the weighted mean of the trials' peaks, as read
	ProbeV    float64   `json:"probe_v"`     // V: what the probe's capacitance makes of the prediction, beyond it
	Trials    []string  `json:"trials"`      // those that measured it
	LimitV    float64   `json:"limit_v"`     // V
	Agrees    bool      `json:"agrees"`      // measured and predicted, with the probe, differ by no more than their 95 % interval
	Keeps     bool      `json:"keeps"`       // the peak measured, without the probe, stays under the limit
	OffV      float64   `json:"off_v"`       // V: measured less predicted, the probe's part apart

	// What would account for the difference alone, where they do not agree; 0: nothing within a factor of five.
	CurrentA    float64 `json:"current_a"`    // A: another loop current at turn-off
	InductanceH float64 `json:"inductance_h"` // H: another loop inductance
}

// Confirm compares the prediction with the peaks of the trials that fitted its network. The difference of the two is judged
// by its own 95 % interval, from both standard uncertainties (GUM 5.1.2). A trial's probe adds to the node's capacitance: what
// that does to the peak counts as part of the prediction.
func (p Prediction) Confirm(trials []Trial) (*Confirmation, error) {
	out := &Confirmation{Network: p.Network.Kind, R: p.Network.R, C: p.Network.C, Predicted: &p.Peak, LimitV: p.LimitV, Trials: []string{}}
	plain, err := peakOf(p.Loop, p.Network, p.Excitation)
	if err != nil {
		return nil, fmt.Errorf("confirming %s of %g ohm and %g F: %w", p.Network.Kind, p.Network.R, p.Network.C, err)
	}
	var sum, weight, shift float64
	for _, t := range trials {
		peak, ok := t.Reading(PeakV)
		if !ok || t.Struck != "" || t.Network.Kind != p.Network.Kind || !same(t.Network.C, p.Network.C) || !same(t.Network.R, p.Network.R) {
			continue
		}
		u := peak.U
		if u == 0 {
			u = unstatedPeak * peak.Value
		}
		probed := p.Loop
		probed.Capacitance += t.ProbeC
		v, err := peakOf(probed, p.Network, p.Excitation)
		if err != nil {
			return nil, fmt.Errorf("confirming with trial %s: %w", t.ID, err)
		}
		sum += peak.Value / (u * u)
		shift += (v - plain) / (u * u)
		weight += 1 / (u * u)
		out.Trials = append(out.Trials, t.ID)
	}
	if weight == 0 {
		return nil, fmt.Errorf("confirming %s of %g ohm and %g F: %w", p.Network.Kind, p.Network.R, p.Network.C, errors.New("no trial fitted it and read its peak; fit it and take one"))
	}
	out.Measured = estimate(sum/weight, 1/math.Sqrt(weight), normal95)
	out.ProbeV = shift / weight
	out.OffV = out.Measured.Value - p.Peak.Value - out.ProbeV
	out.Agrees = math.Abs(out.OffV) <= normal95*math.Hypot(out.Measured.U, p.Peak.U)
	out.Keeps = out.Measured.Value-out.ProbeV <= p.LimitV
	if !out.Agrees {
		out.CurrentA = p.cause(plain+out.OffV, p.Excitation.Current, func(l *Loop, e *Excitation) *float64 { return &e.Current })
		out.InductanceH = p.cause(plain+out.OffV, p.Loop.Inductance, func(l *Loop, e *Excitation) *float64 { return &l.Inductance })
	}
	return out, nil
}

// cause is the value, from a fifth to five times was, of the one that which points at, with which the peak would be want; 0
// where none is. The peak grows with the loop's current and inductance.
func (p Prediction) cause(want, was float64, which func(*Loop, *Excitation) *float64) float64 {
	peak := func(x float64) (float64, error) {
		l, e := p.Loop, p.Excitation
		*which(&l, &e) = x
		return peakOf(l, p.Network, e)
	}
	low, high := was/5, was*5
	least, err := peak(low)
	most, err2 := peak(high)
	if err != nil || err2 != nil || was == 0 || want < least || want > most {
		return 0
	}
	for range 60 {
		mid := (low + high) / 2
		if v, err := peak(mid); err != nil {
			return 0
		} else if v < want {
			low = mid
		} else {
			high = mid
		}
	}
	return (low + high) / 2
}

// peakOf is the exact peak of the node with any network, V.
func peakOf(l Loop, n Network, e Excitation) (float64, error) {
	if n.Kind == RCD {
		turn, err := TurnOff(l, n, e)
		return turn.Peak.Volts, err
	}
	r, err := Respond(l, n, e)
	if err != nil {
		return 0, err
	}
	return r.Peak().Volts, nil
}

// same says whether two nominal values are one, whatever way they were written.
func same(a, b float64) bool { return math.Abs(a-b) <= 1e-9*math.Max(math.Abs(a), math.Abs(b)) }
