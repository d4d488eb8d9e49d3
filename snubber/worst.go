package snubber

import (
	"errors"
	"fmt"
)

// Point is the operating point a network is chosen for.
type Point struct {
	Excitation
	SwitchingHz float64 // Hz; 0: no trial states it
}

// Worst is the hardest operating point among the trials that stand: the highest bus and switching frequency stated,
// with the excitation that the fit found. Where no peak was read, the largest load current stated is taken for the
// loop current, and a note says so.
func Worst(f *FitResult, trials []Trial) (p Point, notes []string, err error) {
	load := 0.0
	for _, t := range trials {
		if t.Struck != "" {
			continue
		}
		p.Bus = max(p.Bus, t.Operating().BusV)
		p.SwitchingHz = max(p.SwitchingHz, t.Operating().SwitchingHz)
		load = max(load, t.Operating().CurrentA)
	}
	switch {
	case p.Bus == 0:
		return Point{}, nil, errors.New("choosing an operating point: no trial states its bus voltage; state bus_v, or read it")
	case f.Excitation != nil:
		p.Current = f.Excitation.Value
	case load > 0:
		p.Current = load
		notes = append(notes, fmt.Sprintf("no peak was read, so the load current of %.3g A was taken for the loop current at turn-off; read peak_v on the bare node", load))
	default:
		return Point{}, nil, errors.New("choosing an operating point: neither a peak nor a load current is known, so the excitation is not; read peak_v on the bare node")
	}
	if f.Loop.Resistance == nil {
		notes = append(notes, "no decay was read, so the loop was taken as free of loss, which overstates the peak a little; read decay_s")
	}
	return p, notes, nil
}
