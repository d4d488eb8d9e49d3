package snubber

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"
)

// Prospect is what a network will meet: the loop and its excitation at one operating point, as the fit has them, and as
// they may as well be.
type Prospect struct {
	Loop       Loop
	Excitation Excitation

	nominal circuitValues
	drawn   []circuitValues // the same, drawn from the fit's joint distribution
	by      []circuitValues // the standard uncertainties of the fit as steps along its principal directions
	point   int
}

// Exactly is the prospect of a loop known exactly.
func Exactly(l Loop, e Excitation) (*Prospect, error) {
	if _, err := Respond(l, Network{Kind: Bare}, e); err != nil {
		return nil, err
	}
	return &Prospect{Loop: l, Excitation: e, nominal: circuitValues{atL: l.Inductance, atC: l.Capacitance, atR: l.Resistance, atE: e.Bus, atI0: e.Current, atRef: e.Bus}}, nil
}

// loadShare is the relative standard uncertainty with which a load current is the loop's at turn-off, where no peak was read:
// the ripple is on it. A third of the usual ripple of 30 % (common practice).
const loadShare = 0.1

// Ahead is the prospect at an operating point, with n draws from the fit's joint distribution of loop, excitation and
// effects, correlations and all: the same seed gives the same draws.
//
// Where the fit has no excitation for the point, the load current stands in for it, and a note says so. Where no decay was
// read the loop is taken as free of loss, which overstates the peak a little.
func (f *FitResult) Ahead(at OperatingPoint, n int, seed uint64) (p *Prospect, notes []string, err error) {
	if f.state == nil {
		return nil, nil, errors.New("predicting from a fit: the fit has found nothing")
	}
	if !(at.BusV > 0) {
		return nil, nil, errors.New("predicting from a fit: the bus voltage is not known; state bus_v with the trials, or read it")
	}
	m, fit := f.state.model, f.state.fit
	if f.Loop.Resistance == nil {
		notes = append(notes, noteNoLoss)
	}
	point, amps, ampsU, err := f.driving(at)
	if err != nil {
		return nil, nil, fmt.Errorf("predicting from a fit: %w", err)
	}
	if point < 0 {
		notes = append(notes, noteLoad(at))
	}
	chol, err := widened(f.state)
	if err != nil {
		return nil, nil, err
	}
	values := func(p []float64, amps, rest float64) circuitValues { return m.driven(p, at.BusV, amps, rest) }
	p = &Prospect{point: point, nominal: values(fit.P, amps, 1)}
	p.Loop = Loop{p.nominal[atL], p.nominal[atC], p.nominal[atR]}
	p.Excitation = Excitation{Bus: at.BusV, Current: amps}
	move := func(z []float64) ([]float64, float64) {
		q := make([]float64, m.params)
		for i := range q {
			q[i] = fit.P[i]
			for j := 0; j <= i; j++ {
				q[i] += chol.At(i, j) * z[j]
			}
		}
		if point >= 0 && m.amps[point] >= 0 {
			return q, math.Abs(q[m.amps[point]])
		}
		return q, amps
	}
	// One step of a standard uncertainty along each of the distribution's independent directions.
	z := make([]float64, m.params)
	for j := range z {
		z[j] = 1
		q, a := move(z)
		p.by = append(p.by, values(q, a, 1))
		z[j] = 0
	}
	if ampsU > 0 {
		p.by = append(p.by, values(fit.P, amps+ampsU, 1))
	}
	p.by = append(p.by, values(fit.P, amps, 1+atRest))
	rng := rand.New(rand.NewPCG(seed, 0x72696e67))
	for range n {
		for j := range z {
			z[j] = rng.NormFloat64()
		}
		q, a := move(z)
		if ampsU > 0 {
			a = math.Abs(a + ampsU*rng.NormFloat64())
		}
		p.drawn = append(p.drawn, values(q, a, 1+atRest*rng.NormFloat64()))
	}
	return p, notes, nil
}

const noteNoLoss = "no decay was read, so the loop was taken as free of loss, which overstates the peak a little; read decay_s"

func noteLoad(at OperatingPoint) string {
	return fmt.Sprintf("no peak was read at this operating point, so the load current of %.3g A was taken for the loop current at turn-off; read peak_v on the bare node", at.CurrentA)
}

// driving is what the loop carries at an operating point: the index of the fit's own point and the current it has there; or
// -1 and the load current in its stead. Where the current is none of the fit's parameters it has an uncertainty of its own.
func (f *FitResult) driving(at OperatingPoint) (point int, amps, ampsU float64, err error) {
	m := f.state.model
	point = -1
	for i, x := range m.obs.points {
		if x.same(at) && (m.amps[i] >= 0 || x.still) {
			point = i
		}
	}
	switch {
	case point >= 0 && m.obs.points[point].still:
		for _, x := range f.Excitations {
			if m.obs.points[point].same(OperatingPoint{BusV: x.BusV, CurrentA: x.CurrentA}) {
				ampsU = x.Excitation.U
			}
		}
		return point, 0, ampsU, nil
	case point >= 0:
		return point, math.Abs(f.state.fit.P[m.amps[point]]), 0, nil
	case at.CurrentA > 0:
		return -1, at.CurrentA, loadShare * at.CurrentA, nil
	}
	return -1, 0, 0, errors.New("neither a peak nor a load current is known, so the excitation is not; read peak_v on the bare node")
}

// driven is the circuit at parameters p with its capacitance times rest, at a bus and a current.
func (m *model) driven(p []float64, bus, amps, rest float64) circuitValues {
	l := m.loop(p)
	v := circuitValues{atL: l.Inductance, atC: l.Capacitance * rest, atR: l.Resistance, atE: bus, atI0: amps, atRef: m.ref}
	for e, k := range m.effect {
		if k >= 0 {
			v[effectAt[e]] = math.Exp(p[k])
		}
	}
	return v
}

// widened is the Cholesky factor of the fit's covariance of its shared parameters, widened as its intervals are.
func widened(o *outcome) (*mat.TriDense, error) {
	var chol mat.Cholesky
	cov := mat.NewSymDense(o.model.params, nil)
	w := o.scatter()
	cov.ScaleSym(w*w, o.fit.Cov)
	if !chol.Factorize(cov) {
		return nil, errors.New("predicting from a fit: its covariance has no full rank; take one more trial")
	}
	var l mat.TriDense
	chol.LTo(&l)
	return &l, nil
}

// predict is the peak and the damping ratio of a network.
func (v *circuitValues) predict(n *Network) (peak, damping float64) {
	x := *v
	x[atCs], x[atRs] = n.C, n.SeriesOhm()
	if n.Kind == Bare {
		x[atLead] = 0
	}
	if x.plain() {
		r := x.respond()
		return r.Peak().Volts, r.DampingRatio()
	}
	s, _ := x.signs(true)
	d := 1 / s[decayAt]
	if w := 2 * math.Pi * s[ringAt]; w > 0 {
		return s[peakAt], d / math.Hypot(d, w)
	}
	return s[peakAt], 1
}
