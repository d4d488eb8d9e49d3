package snubber

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"

	"ringbook/snubber/preferred"
	"ringbook/snubber/quantity"
)

// Limits are what a recommendation must keep, and the parts it may use.
type Limits struct {
	MaxPeak     float64          // V, > 0: the highest voltage allowed across the switch
	MinDamping  float64          // damping ratio of the ringing pair, 0 to 1; 0: no limit
	MaxLoss     float64          // W; 0: no limit
	SwitchingHz float64          // Hz, > 0
	CSeries     preferred.Series // 0: E12
	RSeries     preferred.Series // 0: E24
	CTol        float64          // bound of the capacitor's error, fraction; 0: parts taken as nominal
	RTol        float64          // bound of the resistor's error, fraction; 0: parts taken as nominal
}

// Choice is one network with what it is predicted to do.
type Choice struct {
	Network   Kind      `json:"network"`
	R         float64   `json:"r_ohm"`
	C         float64   `json:"c_f"`
	Peak      *Estimate `json:"peak_v"`        // with the parts at nominal; the interval covers their tolerance
	Damping   *Estimate `json:"damping_ratio"` // likewise
	LossW     float64   `json:"loss_w"`        // resistor, switch and loop
	ResistorW float64   `json:"resistor_w"`
	SwitchW   float64   `json:"switch_w"`
	LoopW     float64   `json:"loop_w"`
	Ratings   Ratings   `json:"ratings"`
}

// Ratings are the least ratings of the parts to buy.
type Ratings struct {
	ResistorW  float64 `json:"resistor_w"`  // W at the part's surroundings: twice the loss, next standard power above
	CapacitorV float64 `json:"capacitor_v"` // V: the highest voltage the capacitor sees
}

// Recommendation is the answer to Recommend.
type Recommendation struct {
	Met          bool     `json:"met"`
	LimitV       float64  `json:"limit_v"`       // V: the peak limit it was asked to keep
	Choice       *Choice  `json:"choice"`        // the least loss that keeps the limits, or the nearest miss
	Alternatives []Choice `json:"alternatives"`  // more loss for a lower peak, in order of loss
	RuleOfThumb  *Choice  `json:"rule_of_thumb"` // R = Z0 and C three times the loop's, nearest in series
	Bare         *Choice  `json:"bare"`          // what the loop does with nothing fitted
	Warnings     []string `json:"warnings"`
}

// The range of parts searched, relative to the loop: outside it a capacitor does nothing or costs more than any
// bench accepts, and a resistor is a wire or is not there.
const (
	searchCLow, searchCHigh = 0.1, 100.0 // of the loop's capacitance
	searchRLow, searchRHigh = 0.03, 30.0 // of the loop's impedance
	alternatives            = 5
)

// Recommend chooses R and C: the network of least loss whose peak, with the parts anywhere in tolerance, stays
// under the limit.
//
// For each capacitor of the series the resistor that keeps the peak lowest is taken among those that keep the
// damping: the loss is the capacitor's, and the resistor hardly changes it. The peak and the damping are those of
// the exact response. An error means that there is nothing to compute; limits that nothing meets are an answer
// with Met false, whose Choice is the nearest miss.
func Recommend(ctx context.Context, l Loop, e Excitation, lim Limits) (*Recommendation, error) {
	if err := lim.check(e); err != nil {
		return nil, fmt.Errorf("recommending a network: %w", err)
	}
	if lim.CSeries == 0 {
		lim.CSeries = preferred.E12
	}
	if lim.RSeries == 0 {
		lim.RSeries = preferred.E24
	}
	bare, err := evaluate(l, Network{Kind: Bare}, e, lim)
	if err != nil {
		return nil, fmt.Errorf("recommending a network: %w", err)
	}
	rec := &Recommendation{LimitV: lim.MaxPeak, Bare: bare, Alternatives: []Choice{}, Warnings: []string{}}
	cs, err := lim.CSeries.Between(searchCLow*l.Capacitance, searchCHigh*l.Capacitance)
	if err != nil {
		return nil, fmt.Errorf("recommending a network: capacitors near the loop's: %w", err)
	}
	z := l.Impedance()
	rs, err := lim.RSeries.Between(searchRLow*z, searchRHigh*z)
	if err != nil {
		return nil, fmt.Errorf("recommending a network: resistors near the loop's impedance: %w", err)
	}
	var nearest *Choice
	for _, c := range cs {
		if err := ctx.Err(); err != nil {
			return nil, fmt.Errorf("recommending a network: %w", err)
		}
		best, err := bestResistor(l, e, lim, c, rs)
		if err != nil {
			return nil, fmt.Errorf("recommending a network: %w", err)
		}
		switch {
		case !best.keeps(lim):
			if nearest == nil || best.misses(lim) < nearest.misses(lim) {
				nearest = best
			}
		case rec.Choice == nil:
			rec.Choice, rec.Met = best, true
		case len(rec.Alternatives) < alternatives && best.Peak.High < rec.front().Peak.High:
			rec.Alternatives = append(rec.Alternatives, *best)
		}
	}
	if rec.Choice == nil {
		rec.Choice = nearest
		rec.Warnings = append(rec.Warnings, lim.cure(nearest))
	}
	thumbC, err := lim.CSeries.Nearest(3 * l.Capacitance)
	if err != nil {
		return nil, fmt.Errorf("recommending a network: %w", err)
	}
	thumbR, err := lim.RSeries.Nearest(z)
	if err != nil {
		return nil, fmt.Errorf("recommending a network: %w", err)
	}
	rec.RuleOfThumb, err = evaluate(l, lim.rc(thumbR, thumbC), e, lim)
	if err != nil {
		return nil, fmt.Errorf("recommending a network: the rule of thumb: %w", err)
	}
	return rec, nil
}

// front is the last network kept: the one with the lowest peak so far.
func (r *Recommendation) front() *Choice {
	if n := len(r.Alternatives); n > 0 {
		return &r.Alternatives[n-1]
	}
	return r.Choice
}

func (lim Limits) check(e Excitation) error {
	switch {
	case !(lim.MaxPeak > 0) || math.IsInf(lim.MaxPeak, 0):
		return fmt.Errorf("peak limit %g V: it must be positive; give the board's rating or a limit", lim.MaxPeak)
	case !(e.Bus > 0):
		return errors.New("the bus voltage is not known; read it or state it with the trials")
	case lim.MaxPeak <= e.Bus:
		return fmt.Errorf("peak limit %g V is not above the bus of %g V: the node settles at the bus, so no network can keep it; raise the limit or the device's rating, or lower the bus", lim.MaxPeak, e.Bus)
	case !(lim.SwitchingHz > 0) || math.IsInf(lim.SwitchingHz, 0):
		return fmt.Errorf("switching frequency %g Hz: the loss needs it; state it with the trials or the request", lim.SwitchingHz)
	case !(lim.MinDamping >= 0 && lim.MinDamping <= 1):
		return fmt.Errorf("least damping ratio %g: it lies between 0 and 1", lim.MinDamping)
	case !(lim.MaxLoss >= 0):
		return fmt.Errorf("loss limit %g W: it must be zero (no limit) or positive", lim.MaxLoss)
	case !(lim.CTol >= 0 && lim.CTol < 1) || !(lim.RTol >= 0 && lim.RTol < 1):
		return fmt.Errorf("part tolerances %g and %g: each is a fraction from 0 to 1, such as 0.05", lim.CTol, lim.RTol)
	}
	return nil
}

func (lim Limits) rc(r, c float64) Network {
	return Network{Kind: RC, R: r, C: c, RTol: lim.RTol, CTol: lim.CTol}
}

// bestResistor is, for one capacitor, the resistor that misses the limits least and, among those that keep them,
// leaves the lowest peak.
func bestResistor(l Loop, e Excitation, lim Limits, c float64, rs []float64) (*Choice, error) {
	var best *Choice
	for _, r := range rs {
		x, err := evaluate(l, lim.rc(r, c), e, lim)
		if err != nil {
			return nil, err
		}
		if best == nil || x.misses(lim) < best.misses(lim) ||
			x.misses(lim) == best.misses(lim) && x.Peak.High < best.Peak.High {
			best = x
		}
	}
	return best, nil
}

// misses says how far a choice lies outside the limits, as the sum of its relative excesses; 0 when it keeps them.
func (x *Choice) misses(lim Limits) float64 {
	m := math.Max(0, x.Peak.High/lim.MaxPeak-1)
	if lim.MinDamping > 0 {
		m += math.Max(0, 1-x.Damping.Low/lim.MinDamping)
	}
	if lim.MaxLoss > 0 {
		m += math.Max(0, x.LossW/lim.MaxLoss-1)
	}
	return m
}

func (x *Choice) keeps(lim Limits) bool { return x.misses(lim) == 0 }

// cure says what the nearest miss lacks.
func (lim Limits) cure(x *Choice) string {
	s := fmt.Sprintf("no RC network of these series keeps the limits; the nearest, %s with %s,", quantity.Code(x.R, quantity.Resistance), quantity.Code(x.C, quantity.Capacitance))
	var lacks []string
	if x.Peak.High > lim.MaxPeak {
		lacks = append(lacks, fmt.Sprintf("peaks at up to %s (allow that much, lower the bus or the current, or shorten the loop)", quantity.Format(x.Peak.High, quantity.Voltage, 4)))
	}
	if lim.MinDamping > 0 && x.Damping.Low < lim.MinDamping {
		lacks = append(lacks, fmt.Sprintf("damps the ring to %.3g only (ask for less damping)", x.Damping.Low))
	}
	if lim.MaxLoss > 0 && x.LossW > lim.MaxLoss {
		lacks = append(lacks, fmt.Sprintf("loses %s (allow that much, or switch less often)", quantity.Format(x.LossW, quantity.Power, 3)))
	}
	return s + " " + strings.Join(lacks, " and ")
}

// evaluate predicts one network. The intervals of peak and damping are the extremes over the corners of the
// parts' tolerances; u takes them as bounds of a rectangular distribution (GUM 4.3.7).
func evaluate(l Loop, n Network, e Excitation, lim Limits) (*Choice, error) {
	loss, err := SwitchingLoss(l, n, e, lim.SwitchingHz)
	if err != nil {
		return nil, err
	}
	x := &Choice{Network: n.Kind, R: n.R, C: n.C,
		LossW: loss.Total, ResistorW: loss.Resistor, SwitchW: loss.Switch, LoopW: loss.Loop}
	for i, corner := range corners(n) {
		r, err := Respond(l, corner, e)
		if err != nil {
			return nil, err
		}
		peak, damping := r.Peak().Volts, r.DampingRatio()
		if i == 0 {
			x.Peak = &Estimate{Value: peak, Low: peak, High: peak}
			x.Damping = &Estimate{Value: damping, Low: damping, High: damping}
			continue
		}
		x.Peak.Low, x.Peak.High = math.Min(x.Peak.Low, peak), math.Max(x.Peak.High, peak)
		x.Damping.Low, x.Damping.High = math.Min(x.Damping.Low, damping), math.Max(x.Damping.High, damping)
	}
	for _, q := range []*Estimate{x.Peak, x.Damping} {
		q.U = (q.High - q.Low) / (2 * math.Sqrt(3))
	}
	x.Ratings = Ratings{ResistorW: powerRating(loss.Resistor), CapacitorV: x.Peak.High}
	return x, nil
}

// corners lists a network at nominal and at the corners of its parts' tolerances.
func corners(n Network) []Network {
	out := []Network{n}
	cs, rs := []float64{n.C}, []float64{n.R}
	if n.CTol > 0 {
		cs = []float64{n.C * (1 - n.CTol), n.C * (1 + n.CTol)}
	}
	if n.RTol > 0 {
		rs = []float64{n.R * (1 - n.RTol), n.R * (1 + n.RTol)}
	}
	if n.CTol == 0 && n.RTol == 0 {
		return out
	}
	for _, c := range cs {
		for _, r := range rs {
			m := n
			m.C, m.R = c, r
			out = append(out, m)
		}
	}
	return out
}

// powerRating is the next standard resistor power above twice the loss, W; above the largest, twice the loss
// itself. Common practice; the data sheet's derating line decides.
func powerRating(w float64) float64 {
	for _, p := range []float64{0.0625, 0.1, 0.125, 0.25, 0.5, 1, 2, 3, 5, 7, 10, 15, 25, 50, 100} {
		if p >= 2*w {
			return p
		}
	}
	return 2 * w
}
