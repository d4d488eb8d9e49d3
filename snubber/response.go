package snubber

import (
	"errors"
	"fmt"
	"math"
)

// ErrNetwork is wrapped by the error for a network that has no single closed form.
var ErrNetwork = errors.New("its response has no single closed form")

// Response is the closed-form answer of a loop with a network fitted to a switch that lets go.
//
// With w0 = 1/sqrt(L C), Z0 = sqrt(L/C), tau = w0 t, rho = Rs/Z0, a = Cs/C and every state measured from
// where it settles (z = i Z0, d = v - E, g = u - E, u the voltage of the network's capacitor):
//
//	z' = -d - (r/Z0) z      d' = z - (d - g)/rho      g' = (d - g)/(rho a)
//	z(0) = I0 Z0            d(0) = -E                 g(0) = -E
//
// The characteristic polynomial is of third order with a real pole and a pair; with no network, or with
// a capacitor alone, of second order with a pair. The equations are Kirchhoff's for the circuit in the
// package comment; the closed form is Newton's interpolation form of the matrix exponential on the poles
// (Moler and Van Loan, "Nineteen Dubious Ways to Compute the Exponential of a Matrix", SIAM Review 20, 801,
// 1978, method 18, from memory), which stays exact where poles meet.
type Response struct {
	w0, z0 float64 // rad/s and ohm of the loop with its probe: the scales of time and current
	bus    float64 // V
	modes  modes
	node   series // d, V
	inner  series // g, V: the network's capacitor; equal to node when there is none in series with R
	loop   series // z, V
}

// Respond is the response of loop l with network n fitted to excitation e.
//
// A capacitor alone with ESR is treated as an rc network of that resistance.
func Respond(l Loop, n Network, e Excitation) (Response, error) {
	if err := l.Check(); err != nil {
		return Response{}, err
	}
	if err := n.Check(); err != nil {
		return Response{}, err
	}
	if !(e.Bus >= 0) || math.IsInf(e.Bus, 0) {
		return Response{}, fmt.Errorf("bus voltage %g V: it must be zero or a positive, finite number", e.Bus)
	}
	if !(e.Current >= 0) || math.IsInf(e.Current, 0) {
		return Response{}, fmt.Errorf("loop current %g A: it must be zero or a positive, finite number", e.Current)
	}
	if n.Kind == RCD || n.RInductance > 0 {
		return Response{}, fmt.Errorf("network %s with a diode or an inductive resistor: %w; TurnOff has its edge", n.Kind, ErrNetwork)
	}
	return respond(l, n, e), nil
}

// respond is Respond for values already checked.
func respond(l Loop, n Network, e Excitation) Response {
	r := Response{w0: 1 / math.Sqrt(l.Inductance*l.Capacitance), z0: l.Impedance(), bus: e.Bus}
	loss := l.Resistance / r.z0
	z := e.Current * r.z0
	a := n.C / l.Capacitance
	rho := n.SeriesOhm() / r.z0
	if rho == 0 { // bare, or a capacitor alone: z' = -d - loss z, d' = z/(1+a)
		k := 1 / (1 + a)
		r.modes = quadratic(loss, k)
		r.node = r.modes.from(-e.Bus, z*k, 0)
		r.inner = r.node
		r.loop = r.modes.from(z, e.Bus-loss*z, 0)
		return r
	}
	// The monic characteristic polynomial, from methods: rho a s^3 + (1+a+loss rho a) s^2 + (rho a + loss(1+a)) s + 1.
	r.modes = cubic((1+a)/(rho*a)+loss, 1+loss*(1+a)/(rho*a), 1/(rho*a))
	z1 := e.Bus - loss*z                         // z'
	d2 := z1 - z/rho                             // d'' : d' = z and g' = 0 at the start
	r.node = r.modes.from(-e.Bus, z, d2)         // d
	r.inner = r.modes.from(-e.Bus, 0, z/(rho*a)) // g
	r.loop = r.modes.from(z, z1, -z-loss*z1)
	return r
}

// NodeAt is the node's voltage t seconds after the switch lets go, V. Before that it is 0.
func (r Response) NodeAt(t float64) float64 {
	if t < 0 {
		return 0
	}
	return r.bus + r.node.at(r.modes.basis(r.w0*t))
}

// CapacitorAt is the voltage across the network's capacitor, without its ESR, at t seconds, V. With a bare
// node or a capacitor alone it is the node's.
func (r Response) CapacitorAt(t float64) float64 {
	if t < 0 {
		return 0
	}
	return r.bus + r.inner.at(r.modes.basis(r.w0*t))
}

// LoopCurrentAt is the current in the loop's inductance t >= 0 seconds after the switch lets go, A.
func (r Response) LoopCurrentAt(t float64) float64 {
	return r.loop.at(r.modes.basis(r.w0*math.Max(t, 0))) / r.z0
}

// Poles are the poles of the response, rad/s: the pair (or the two real poles), then the real one where the
// network makes one.
func (r Response) Poles() []complex128 {
	m := r.modes
	w := r.w0
	var p []complex128
	if m.q >= 0 {
		s := math.Sqrt(m.q)
		p = append(p, complex(-m.sigma*w, s*w), complex(-m.sigma*w, -s*w))
	} else {
		s := math.Sqrt(-m.q)
		// The smaller root from the product, which does not cancel.
		big := m.sigma + s
		p = append(p, complex(-m.wn2()/big*w, 0), complex(-big*w, 0))
	}
	if m.third {
		p = append(p, complex(m.p*w, 0))
	}
	return p
}

// DampingRatio is the damping ratio of the ringing pair; 1 where no pair rings (all poles real).
func (r Response) DampingRatio() float64 {
	if r.modes.q <= 0 {
		return 1
	}
	return r.modes.sigma / math.Sqrt(r.modes.wn2())
}

// RingHz is the damped ring frequency, Hz; ok is false where nothing rings.
func (r Response) RingHz() (hz float64, ok bool) {
	if r.modes.q <= 0 {
		return 0, false
	}
	return math.Sqrt(r.modes.q) * r.w0 / (2 * math.Pi), true
}

// DecayS is the time in which the ring's envelope falls to 1/e, s; ok is false where nothing rings, and the
// time is +Inf where nothing damps.
func (r Response) DecayS() (s float64, ok bool) {
	if r.modes.q <= 0 {
		return 0, false
	}
	return 1 / (r.modes.sigma * r.w0), true
}
