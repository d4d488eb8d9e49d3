package snubber

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat"
)

// What is taken where a trial states no uncertainty, as a fraction of the value (standard uncertainties) or as a bound
// (tolerances). A warning says so.
const (
	unstatedRing  = 0.005
	unstatedDecay = 0.05
	unstatedPeak  = 0.02
	unstatedTol   = 0.05

	// How well one loop of constant parts describes a real node, for readings that samples give to parts in ten thousand:
	// its capacitance changes with the swing, and what of the ring is read with how fast it dies (common practice; seen on
	// the simulated bench, whose node is half a junction).
	modelRing  = 0.002
	modelDecay = 0.01
	modelPeak  = 0.003
)

// observed is one trial as the fit sees it: what was read, with its standard uncertainty, and the parts behind it. A
// value that was not read is NaN.
type observed struct {
	trial *Trial
	value [3]float64 // ring Hz, decay s, peak V
	u     [3]float64 // standard uncertainties of those
	typeA [3]float64 // the part of the variance that comes from the scatter of repeats, 0 to 1
	dof   [3]float64 // degrees of freedom of that part
	bus   float64    // V; 0: not known
	point int        // which excitation applies: an index of operating points
	c     int        // which capacitor: an index of capacitors; -1: none
	r     int        // which resistor: an index of resistors; -1: none
}

const (
	ringAt = iota
	decayAt
	peakAt
)

var observedQuantity = [3]Quantity{RingHz, DecayS, PeakV}

// physicalPart is one part that may have served in several trials: its best known value and how well it is known.
type physicalPart struct {
	value float64 // F or ohm
	u     float64 // standard uncertainty of value, same unit
	bound bool    // known by a tolerance's bound (rectangular) and not by a measurement (normal)
	first int     // the first trial it served in
	uses  int     // how many trials it served in
	key   partKey // what makes it this part
}

// operating is one operating point: trials at it share their excitation.
type operating struct {
	bus, load float64 // V, A; 0: not known
	peaks     int     // how many peaks were read at it
	still     bool    // they are no higher than the bus alone drives them: the excitation is too small to tell
}

// samePoint is how far apart, relatively, two settings of bus or load may be read and still be one operating point.
const samePoint = 0.02

func (p operating) same(q OperatingPoint) bool {
	near := func(a, b float64) bool { return math.Abs(a-b) <= samePoint*math.Max(a, b) }
	return near(p.bus, q.BusV) && near(p.load, q.CurrentA)
}

// point finds or adds the operating point of a trial.
func (o *observations) point(at OperatingPoint) int {
	for i, p := range o.points {
		if p.same(at) {
			return i
		}
	}
	o.points = append(o.points, operating{bus: at.BusV, load: at.CurrentA})
	return len(o.points) - 1
}

// observations is all that the fit knows.
type observations struct {
	list   []observed
	caps   []physicalPart
	ohms   []physicalPart
	points []operating
	counts [3]int // readings of each kind

	warnings []string
}

// partKey says which uses are of the same physical part: those of one drawer entry, or of one nominal value and
// tolerance in one session.
type partKey struct {
	name            string
	value, tol      float64
	measured, meanU float64
}

// observe gathers the readings of trials that stand.
func observe(trials []Trial) (*observations, error) {
	o := &observations{}
	caps, ohms := map[partKey]int{}, map[partKey]int{}
	var unstated [3]int
	var unstatedC, unstatedR, noBus, diode int
	for i := range trials {
		t := &trials[i]
		if err := t.Network.Check(); err != nil {
			return nil, fmt.Errorf("trial %s: %w", t.ID, err)
		}
		if t.Network.Kind == RCD {
			diode++
			continue
		}
		at := t.Operating()
		x := observed{trial: t, c: -1, r: -1}
		any := false
		for k, q := range observedQuantity {
			x.value[k], x.u[k] = math.NaN(), math.NaN()
			r, ok := t.Reading(q)
			if !ok {
				continue
			}
			if !(r.Value > 0) || math.IsInf(r.Value, 0) || !(r.U >= 0) || math.IsInf(r.U, 0) {
				return nil, fmt.Errorf("trial %s reads %s = %g with uncertainty %g: both must be finite, the value positive and the uncertainty not negative", t.ID, q, r.Value, r.U)
			}
			if k == peakAt && !(at.BusV > 0) {
				noBus++
				continue
			}
			u := r.U
			if u == 0 {
				u = [3]float64{unstatedRing, unstatedDecay, unstatedPeak}[k] * r.Value
				unstated[k]++
			}
			if r.FromWaveform {
				u = math.Hypot(u, [3]float64{modelRing, modelDecay, modelPeak}[k]*r.Value)
			}
			x.value[k], x.u[k], any = r.Value, u, true
			if n := len(r.Repeats); n > 1 {
				x.typeA[k], x.dof[k] = math.Min(1, scatterOfMean(r.Repeats)/(u*u)), float64(n-1)
			}
			o.counts[k]++
		}
		if !any {
			continue
		}
		x.bus, x.point = at.BusV, o.point(at)
		if !math.IsNaN(x.value[peakAt]) {
			o.points[x.point].peaks++
		}
		session := "session " + t.Session
		if t.Part != "" {
			session = "part " + t.Part
		}
		if n := t.Network; n.Kind.HasC() {
			c, u, stated := fittedC(n)
			if !stated {
				unstatedC++
			}
			x.c = use(caps, &o.caps, partKey{session, n.C, n.CTol, n.MeasuredC, n.MeasuredU}, physicalPart{value: c, u: u, bound: n.MeasuredU == 0, first: i})
		}
		if n := t.Network; n.Kind.HasR() {
			tol := n.RTol
			if tol == 0 {
				tol = unstatedTol
				unstatedR++
			}
			x.r = use(ohms, &o.ohms, partKey{session, n.R, n.RTol, 0, 0}, physicalPart{value: n.R, u: n.R * tol / math.Sqrt(3), bound: true, first: i})
		}
		o.list = append(o.list, x)
	}
	for k, n := range unstated {
		o.warn(n, "%s of %s without an uncertainty: %g %% was taken; state %s_u", "reading", observedQuantity[k], 100*[3]float64{unstatedRing, unstatedDecay, unstatedPeak}[k], observedQuantity[k])
	}
	o.warn(unstatedC, "%s with a capacitor of no stated tolerance: %g %% was taken; state c_tol or measure it", "trial", 100*unstatedTol)
	o.warn(unstatedR, "%s with a resistor of no stated tolerance: %g %% was taken; state r_tol", "trial", 100*unstatedTol)
	o.warn(noBus, "%s left out because the bus voltage is not known; state bus_v", "peak")
	o.warn(diode, "%s left out of the fit because a diode lies across the resistor", "trial")
	return o, nil
}

// warn adds a warning about n things of a name, where there are any; the format starts with their count and name.
func (o *observations) warn(n int, format, name string, args ...any) {
	if n > 0 {
		o.warnings = append(o.warnings, fmt.Sprintf(format, append([]any{count(n, name)}, args...)...))
	}
}

// count is a number of things in words: "1 trial", "2 trials".
func count(n int, name string) string {
	if n == 1 {
		return "1 " + name
	}
	return fmt.Sprintf("%d %ss", n, name)
}

// scatterOfMean is the variance of the mean of repeats, from their scatter (GUM 4.2.3).
func scatterOfMean(repeats []float64) float64 {
	return stat.Variance(repeats, nil) / float64(len(repeats))
}

// use finds or adds the part of a key and counts the use.
func use(index map[partKey]int, parts *[]physicalPart, key partKey, p physicalPart) int {
	i, ok := index[key]
	if !ok {
		i = len(*parts)
		index[key] = i
		p.key = key
		*parts = append(*parts, p)
	}
	(*parts)[i].uses++
	return i
}

// fittedC is the network's capacitance, F, with its standard uncertainty; stated is false where neither a measurement
// nor a tolerance was given. A tolerance is the bound of a rectangular distribution (GUM 4.3.7).
func fittedC(n Network) (c, u float64, stated bool) {
	switch {
	case n.C == 0:
		return 0, 0, true
	case n.MeasuredC > 0 && n.MeasuredU > 0:
		return n.MeasuredC, n.MeasuredU, true
	case n.MeasuredC > 0 && n.CTol > 0:
		return n.MeasuredC, n.MeasuredC * n.CTol / math.Sqrt(3), true
	case n.CTol > 0:
		return n.C, n.C * n.CTol / math.Sqrt(3), true
	}
	return n.C, n.C * unstatedTol / math.Sqrt(3), false
}
