package snubber

import "gonum.org/v1/gonum/stat"

// PeakWithFall is the node's exact peak with a switch whose current falls in the given time.
func PeakWithFall(l Loop, n Network, e Excitation, fall float64) float64 {
	v := circuitValues{atL: l.Inductance, atC: l.Capacitance, atR: l.Resistance, atCs: n.C, atRs: n.R, atE: e.Bus, atI0: e.Current, atFall: fall}
	s, _ := v.signs(true)
	return s[peakAt]
}

// PeakSpread is the standard deviation of the bare peak over n draws of Ahead.
func PeakSpread(f *FitResult, at OperatingPoint, n int) (float64, error) {
	p, _, err := f.Ahead(at, n, 1)
	if err != nil {
		return 0, err
	}
	var peaks []float64
	for i := range p.drawn {
		v, _ := p.drawn[i].predict(&Network{Kind: Bare})
		peaks = append(peaks, v)
	}
	return stat.StdDev(peaks, nil), nil
}
