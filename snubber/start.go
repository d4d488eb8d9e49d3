package snubber

import (
	"errors"
	"math"
	"sort"

	"ringbook/snubber/leastsq"
)

// startPoints is how many points of the line the pairs for a start are drawn from, and startPeaks how many peaks of an
// operating point its excitation is.
const (
	startPoints = 40
	startPeaks  = 15
)

// start is where the fit begins: the loop that most points of the substitution line agree with, whatever the others
// say, so that a mislabelled capacitor cannot lead it astray.
//
// Every two points of different capacitance make a line; the one with the least sum of min(residual^2, 9), in standard
// uncertainties, is taken (the truncated loss of least-median regression; Rousseeuw, J. Am. Stat. Assoc. 79, 871,
// 1984, from memory).
func (m *model) start(line *SubstitutionLine, trials []Trial) ([]float64, error) {
	var loop Loop
	if err := line.enough(); err == nil {
		slope, intercept, ok := line.consensus()
		if !ok {
			return nil, line.fit() // it says which trials contradict each other
		}
		loop = Loop{Inductance: slope, Capacitance: intercept / slope}
	} else {
		var ok bool
		if loop, ok = m.scan(line, trials); !ok {
			return nil, err
		}
	}
	rate, _ := meanDecayRate(trials)
	loop.Resistance = 2 * loop.Inductance * rate
	return m.from(loop), nil
}

// from is the parameters of a loop, with the excitations that explain the peaks.
func (m *model) from(loop Loop) []float64 {
	p := make([]float64, m.params)
	p[0], p[1] = math.Log(loop.Inductance*loop.Capacitance)/2, math.Log(loop.Impedance())
	if m.loss >= 0 {
		if loop.Resistance == 0 { // decays were read under networks with a resistor only
			loop.Resistance = 0.05 * loop.Impedance()
		}
		p[m.loss] = math.Log(loop.Resistance)
	}
	for point, k := range m.amps {
		if k < 0 {
			continue
		}
		var amps []float64
		for _, x := range m.obs.list {
			if x.point != point || math.IsNaN(x.value[peakAt]) || len(amps) == startPeaks {
				continue
			}
			i, _, ok := currentForPeak(loop.WithProbe(x.trial.ProbeC), x.trial.Network, x.bus, x.value[peakAt])
			if !ok {
				i = 0
			}
			amps = append(amps, i)
		}
		sort.Float64s(amps)
		p[k] = amps[len(amps)/2]
		if p[k] == 0 { // not at zero itself, where the peak does not feel the current
			p[k] = 0.1 * m.obs.points[point].bus / loop.Impedance()
		}
	}
	return p
}

// consensus is the line through two points that the others agree with most; ok is false where no two make a loop.
func (s *SubstitutionLine) consensus() (slope, intercept float64, ok bool) {
	points := s.Points
	if len(points) > startPoints {
		sorted := append([]LinePoint{}, points...)
		sort.SliceStable(sorted, func(i, j int) bool { return sorted[i].AddedC < sorted[j].AddedC })
		points = nil
		for k := range startPoints {
			points = append(points, sorted[k*(len(sorted)-1)/(startPoints-1)])
		}
	}
	best := math.Inf(1)
	for i, a := range points {
		for _, b := range points[:i] {
			dx := b.AddedC - a.AddedC
			if math.Abs(dx) <= 1e-6*math.Max(a.AddedC, b.AddedC) {
				continue
			}
			l := (b.Inverse - a.Inverse) / dx
			lc := a.Inverse - l*a.AddedC
			if !(l > 0 && lc > 0) {
				continue
			}
			sum := 0.0
			for _, p := range points {
				r := p.Inverse - lc - l*p.AddedC
				sum += math.Min(r*r/(p.InverseU*p.InverseU+l*l*p.AddedU*p.AddedU), 9)
			}
			if sum < best {
				best, slope, intercept, ok = sum, l, lc, true
			}
		}
	}
	return slope, intercept, ok
}

// scan looks for a loop where the line cannot be drawn, because the capacitors were fitted with resistors: along the
// loops that ring at the frequency read, the impedance whose predictions come nearest.
func (m *model) scan(line *SubstitutionLine, trials []Trial) (Loop, bool) {
	if len(line.Points) == 0 || len(m.obs.ohms) == 0 {
		return Loop{}, false
	}
	bare := line.Points[0]
	rate, _ := meanDecayRate(trials)
	best, loop := math.Inf(1), Loop{}
	var block leastsq.Block
	d := make([]float64, len(m.obs.caps)+len(m.obs.ohms))
	for z := 0.1; z < 1e4; z *= 1.1 {
		// L (C + added) = 1/w0^2 and L = Z0^2 C.
		c := (math.Sqrt(bare.AddedC*bare.AddedC+4*bare.Inverse/(z*z)) - bare.AddedC) / 2
		l := Loop{Inductance: z * z * c, Capacitance: c}
		l.Resistance = 2 * l.Inductance * rate
		p, sum := m.from(l), 0.0
		for i := range m.obs.list {
			m.eval(&m.obs.list[i], p, d, false, &block)
			for _, r := range block.R {
				sum += math.Min(r*r, 100)
			}
		}
		if sum < best {
			best, loop = sum, l
		}
	}
	return loop, !math.IsInf(best, 1)
}

// nothingToFit says what is missing where no trial gave a reading that the fit can use.
func nothingToFit() error {
	return errors.New("no trial in scope has a reading of ring_hz, decay_s or peak_v that the fit can use; take at least one bare trial and one with a known capacitor")
}
