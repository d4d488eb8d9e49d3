package snubber

import "math"

// smallCurrent is the excitation, as a part of E/Z0, below which a peak hardly tells it: the peak grows with its square.
const smallCurrent = 0.03

// still marks the operating points whose fitted excitation is too small for the peaks to tell, and says whether there are
// any. Left in the fit such a current is a parameter that nothing holds.
func (m *model) still(p []float64) bool {
	any := false
	z := m.loop(p).Impedance()
	for i, k := range m.amps {
		if k >= 0 && math.Abs(p[k]) < smallCurrent*m.obs.points[i].bus/z {
			m.obs.points[i].still, any = true, true
		}
	}
	return any
}

// smallExcitation is the estimate where the peaks are no higher than the bus alone drives them: zero, and at most what
// would lift the best known peak by its own 95 % interval.
func (o *outcome) smallExcitation(point int) *Estimate {
	least, high := math.Inf(1), 0.0
	for _, i := range o.kept {
		x := &o.model.obs.list[i]
		if x.point != point || math.IsNaN(x.value[peakAt]) || x.u[peakAt] >= least {
			continue
		}
		least = x.u[peakAt]
		v := o.model.values(x, o.fit.P, o.fit.D)
		alone, _ := v.signs(true)
		v[atI0] = 0
		l, n := Loop{v[atL], v[atC], v[atR]}, Network{C: v[atCs], R: v[atRs]}
		high, _, _ = currentForPeak(l, n, v[atE], alone[peakAt]+normal95*least)
	}
	return &Estimate{Value: 0, U: high / normal95, Low: 0, High: high}
}
