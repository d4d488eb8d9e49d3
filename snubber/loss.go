package snubber

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Loss is where the power goes that the ring and its network cost, W. Conduction and the switch's own
// overlap of current and voltage are not in it.
type Loss struct {
	Total    float64 // W: Resistor + Switch + Loop
	Resistor float64 // W: in the network's series resistance
	Switch   float64 // W: in the switch, which discharges the node's capacitance at each turn-on
	Loop     float64 // W: in the loop's own loss resistance
}

// SwitchingLoss is the power that a loop with a network loses at hz cycles a second, each with one turn-off at
// excitation e and one turn-on, both rung out before the next.
//
//	at turn-off   (C + Cs) E^2/2 + L I0^2/2   in Rs and r, shared as their currents share it
//	at turn-on     C E^2/2                    in the switch
//	              Cs E^2/2                    in Rs, or in the switch when there is no Rs
//
// The sum is what the source gives: (C + Cs) E^2 a cycle, and the loop current's energy. Energies of capacitors
// charged through a resistance are textbook; the sharing is exact, from Lyapunov's equation of the response.
func SwitchingLoss(l Loop, n Network, e Excitation, hz float64) (Loss, error) {
	r, err := Respond(l, n, e)
	if err != nil {
		return Loss{}, err
	}
	if !(hz >= 0) || math.IsInf(hz, 0) {
		return Loss{}, fmt.Errorf("switching frequency %g Hz: it must be zero or a positive, finite number", hz)
	}
	off := (l.Capacitance+n.C)*e.Bus*e.Bus/2 + l.Inductance*e.Current*e.Current/2
	on := l.Capacitance * e.Bus * e.Bus / 2
	share, err := r.resistorShare(l, n)
	if err != nil {
		return Loss{}, err
	}
	p := Loss{Resistor: hz * off * share, Loop: hz * off * (1 - share), Switch: hz * on}
	if n.SeriesOhm() > 0 {
		p.Resistor += hz * n.C * e.Bus * e.Bus / 2
	} else {
		p.Switch += hz * n.C * e.Bus * e.Bus / 2
	}
	p.Total = p.Resistor + p.Switch + p.Loop
	return p, nil
}

// resistorShare is the part of the turn-off's energy that the network's resistance takes; the loop's takes the
// rest. With x the states (z, d, g) and x' = A x, the energy in Rs is x(0)' P x(0) with A'P + P A = -Q and
// Q = (d - g)^2/rho (Lyapunov's equation; e.g. Kailath, Linear Systems, 1980, from memory).
func (r Response) resistorShare(l Loop, n Network) (float64, error) {
	if n.SeriesOhm() == 0 {
		return 0, nil
	}
	if l.Resistance == 0 {
		return 1, nil
	}
	loss, rho, a := l.Resistance/r.z0, n.SeriesOhm()/r.z0, n.C/l.Capacitance
	A := [3][3]float64{
		{-loss, -1, 0},
		{1, -1 / rho, 1 / rho},
		{0, 1 / (rho * a), -1 / (rho * a)},
	}
	Q := [3][3]float64{{}, {0, 1 / rho, -1 / rho}, {0, -1 / rho, 1 / rho}}
	// Unknowns: the six entries of the symmetric P.
	at := [3][3]int{{0, 1, 2}, {1, 3, 4}, {2, 4, 5}}
	sys, rhs := mat.NewDense(6, 6, nil), mat.NewVecDense(6, nil)
	for i := range 3 {
		for j := i; j < 3; j++ {
			row := at[i][j]
			for k := range 3 {
				sys.Set(row, at[k][j], sys.At(row, at[k][j])+A[k][i])
				sys.Set(row, at[i][k], sys.At(row, at[i][k])+A[k][j])
			}
			rhs.SetVec(row, -Q[i][j])
		}
	}
	var p mat.VecDense
	if err := p.SolveVec(sys, rhs); err != nil {
		if cond, ok := err.(mat.Condition); !ok || math.IsInf(float64(cond), 1) {
			return 0, fmt.Errorf("sharing the turn-off energy between the resistor and the loop: %w", err)
		}
	}
	x := [3]float64{r.loop.y0, r.node.y0, r.inner.y0}
	in := 0.0
	for i := range 3 {
		for j := range 3 {
			in += x[i] * p.AtVec(at[i][j]) * x[j]
		}
	}
	// Of (1 + a) E^2/2 + z^2/2 in units of C V^2.
	all := ((1+a)*r.bus*r.bus + x[0]*x[0]) / 2
	if all == 0 {
		return 0, nil
	}
	return math.Min(math.Max(in/all, 0), 1), nil
}
