package snubber

// Hardest is the operating point a network is to be chosen for: of those at which the trials that stand were taken, the one
// whose bare node peaks highest by the fit, with the highest switching frequency that any of them states.
func (f *FitResult) Hardest(trials []Trial) OperatingPoint {
	var worst, any OperatingPoint
	high, hz := -1.0, 0.0
	for _, x := range f.Excitations {
		e := Excitation{Bus: x.BusV, Current: x.Excitation.High}
		if v := respond(f.Nominal(), Network{Kind: Bare}, e).Peak().Volts; v > high {
			high, worst = v, OperatingPoint{BusV: x.BusV, CurrentA: x.CurrentA}
		}
	}
	for _, t := range trials {
		if t.Struck != "" {
			continue
		}
		at := t.Operating()
		any.BusV, any.CurrentA = max(any.BusV, at.BusV), max(any.CurrentA, at.CurrentA)
		hz = max(hz, at.SwitchingHz)
	}
	if high < 0 {
		worst = any
	}
	worst.SwitchingHz = hz
	return worst
}
