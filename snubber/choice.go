package snubber

import (
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
	SettleS     float64          // s: the node must stay within SettleBand of the bus from then on; 0: no limit
	SettleBand  float64          // fraction of the bus; 0: 0.05
	MaxLoss     float64          // W; 0: no limit
	SwitchingHz float64          // Hz, > 0
	Kinds       []Kind           // networks to choose from: rc, c, rcd; nil: rc
	CSeries     preferred.Series // 0: E12
	RSeries     preferred.Series // 0: E24
	OnHandC     []float64        // F: choose among these capacitors alone; nil: the series
	OnHandR     []float64        // ohm: choose among these resistors alone; nil: the series
	CTol        float64          // bound of the capacitor's error, fraction; 0: parts taken as nominal
	RTol        float64          // bound of the resistor's error, fraction; 0: parts taken as nominal
	DiodeDrop   float64          // V: forward drop of the diode of an rcd network; 0: 0.8
	DiodeOhm    float64          // ohm: its on-resistance; 0: 0.1
	AmbientC    float64          // degrees Celsius where the parts are; 0: 25
}

// Choice is one network with what it is predicted to do.
type Choice struct {
	Network   Kind      `json:"network"`
	R         float64   `json:"r_ohm"`
	C         float64   `json:"c_f"`
	Peak      *Estimate `json:"peak_v"`        // its interval covers the parts' tolerances and what the fit leaves open
	Damping   *Estimate `json:"damping_ratio"` // likewise
	WorstV    float64   `json:"worst_v"`       // V: the peak that the worst corner of the parts keeps on 99 % of the loops that the fit allows
	LossW     float64   `json:"loss_w"`        // resistor, switch and loop
	ResistorW float64   `json:"resistor_w"`
	SwitchW   float64   `json:"switch_w"`
	LoopW     float64   `json:"loop_w"`
	AddedW    float64   `json:"added_w"`  // because the network is there
	AnywayW   float64   `json:"anyway_w"` // lost with or without it, now mostly in the resistor
	RingDB    *float64  `json:"ring_db"`  // dB: the ring in the spectrum relative to the bare node's; null where it has no such figure
	Ratings   Ratings   `json:"ratings"`

	leastDamping float64 // as WorstV, of the damping ratio
	settles      float64 // s, of the nominal parts
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

	// What it was computed for.
	Loop        Loop       `json:"-"`
	Excitation  Excitation `json:"-"`
	SwitchingHz float64    `json:"-"` // Hz
}

func (lim Limits) check(e Excitation) error {
	switch {
	case !(lim.MaxPeak > 0) || math.IsInf(lim.MaxPeak, 0):
		return fmt.Errorf("peak limit %g V: it must be positive; give the board's rating or a limit", lim.MaxPeak)
	case !(e.Bus > 0):
		return errors.New("the bus voltage is not known; read it or state it with the trials")
	case !(lim.SwitchingHz > 0) || math.IsInf(lim.SwitchingHz, 0):
		return fmt.Errorf("switching frequency %g Hz: the loss needs it; state it with the trials or the request", lim.SwitchingHz)
	case !(lim.MinDamping >= 0 && lim.MinDamping <= 1):
		return fmt.Errorf("least damping ratio %g: it lies between 0 and 1", lim.MinDamping)
	case !(lim.SettleS >= 0) || !(lim.SettleBand >= 0 && lim.SettleBand < 1):
		return fmt.Errorf("settling within %g s to %g of the bus: the time is positive and the band a fraction, such as 0.05", lim.SettleS, lim.SettleBand)
	case !(lim.MaxLoss >= 0):
		return fmt.Errorf("loss limit %g W: it must be zero (no limit) or positive", lim.MaxLoss)
	case !(lim.DiodeDrop >= 0 && lim.DiodeOhm >= 0) || math.IsInf(lim.DiodeDrop+lim.DiodeOhm, 0):
		return fmt.Errorf("diode of %g V and %g ohm: both must be zero (the usual) or positive", lim.DiodeDrop, lim.DiodeOhm)
	case !(lim.CTol >= 0 && lim.CTol < 1) || !(lim.RTol >= 0 && lim.RTol < 1):
		return fmt.Errorf("part tolerances %g and %g: each is a fraction from 0 to 1, such as 0.05", lim.CTol, lim.RTol)
	}
	for _, k := range lim.Kinds {
		if k != RC && k != C && k != RCD {
			return fmt.Errorf("network %q: it must be rc, c or rcd", k)
		}
	}
	for _, v := range append(append([]float64{}, lim.OnHandC...), lim.OnHandR...) {
		if !(v > 0) || math.IsInf(v, 0) {
			return fmt.Errorf("part on hand of %g: its value must be positive and finite", v)
		}
	}
	return nil
}

func (lim Limits) filled() Limits {
	if lim.CSeries == 0 {
		lim.CSeries = preferred.E12
	}
	if lim.RSeries == 0 {
		lim.RSeries = preferred.E24
	}
	if lim.SettleBand == 0 {
		lim.SettleBand = 0.05
	}
	if lim.Kinds == nil {
		lim.Kinds = []Kind{RC}
	}
	if lim.AmbientC == 0 {
		lim.AmbientC = 25
	}
	if lim.DiodeDrop == 0 {
		lim.DiodeDrop = 0.8
	}
	if lim.DiodeOhm == 0 {
		lim.DiodeOhm = 0.1
	}
	return lim
}

func (lim Limits) network(k Kind, r, c float64) Network {
	n := Network{Kind: k, C: c, CTol: lim.CTol}
	if k.HasR() {
		n.R, n.RTol = r, lim.RTol
	}
	if k == RCD {
		n.DiodeDrop, n.DiodeOhm = lim.DiodeDrop, lim.DiodeOhm
	}
	return n
}

// misses says how far a choice lies outside the limits, as the sum of its relative excesses; 0 when it keeps them.
func (x *Choice) misses(lim Limits) float64 {
	m := math.Max(0, x.WorstV/lim.MaxPeak-1)
	if lim.MinDamping > 0 {
		m += math.Max(0, 1-x.leastDamping/lim.MinDamping)
	}
	if lim.SettleS > 0 {
		m += math.Max(0, x.settles/lim.SettleS-1)
	}
	if lim.MaxLoss > 0 {
		m += math.Max(0, x.LossW/lim.MaxLoss-1)
	}
	return m
}

func (x *Choice) keeps(lim Limits) bool { return x.misses(lim) == 0 }

// InWords names a network by its parts.
func (x *Choice) InWords() string {
	c, r := quantity.Code(x.C, quantity.Capacitance), quantity.Code(x.R, quantity.Resistance)
	switch x.Network {
	case Bare:
		return "the bare node"
	case C:
		return c + " alone"
	case RCD:
		return r + " in series with " + c + " and a diode across the resistor"
	}
	return r + " in series with " + c
}

// cure says what the nearest miss lacks.
func (lim Limits) cure(x *Choice) string {
	s := fmt.Sprintf("no network of these parts keeps the limits; the nearest, %s,", x.InWords())
	var lacks []string
	if x.WorstV > lim.MaxPeak {
		lacks = append(lacks, fmt.Sprintf("peaks at up to %s (allow that much, lower the bus or the current, or shorten the loop)", quantity.Format(x.WorstV, quantity.Voltage, 4)))
	}
	if lim.MinDamping > 0 && x.leastDamping < lim.MinDamping {
		lacks = append(lacks, fmt.Sprintf("damps the ring to %.3g only (ask for less damping)", x.leastDamping))
	}
	if lim.SettleS > 0 && x.settles > lim.SettleS {
		lacks = append(lacks, fmt.Sprintf("settles in %s (allow that long, or a wider band)", quantity.Format(x.settles, quantity.Time, 3)))
	}
	if lim.MaxLoss > 0 && x.LossW > lim.MaxLoss {
		lacks = append(lacks, fmt.Sprintf("loses %s (allow that much, or switch less often)", quantity.Format(x.LossW, quantity.Power, 3)))
	}
	return s + " " + strings.Join(lacks, " and ")
}

// firstSpike says where the rule of thumb stops the ring and yet leaves the first spike; "" where it does not.
func firstSpike(x *Choice, e Excitation, limit float64) string {
	if x.WorstV <= limit || x.Damping.Value < 0.3 {
		return ""
	}
	return fmt.Sprintf("the rule of thumb (%s) stops the ring (damping ratio %.2g) and still peaks at %s: that first spike is no ring but the loop current of %s forced through the resistor (%s) while the capacitor charges; a larger capacitor with a smaller resistor lowers it, more resistance does not",
		x.InWords(), x.Damping.Value, quantity.Format(x.Peak.Value, quantity.Voltage, 4), quantity.Format(e.Current, quantity.Current, 3), quantity.Format(e.Current*x.R, quantity.Voltage, 3))
}
