package snubber

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
)

// RingLevel is how high the ring stands in the spectrum of the node's voltage with the network fitted, relative to the
// bare node, dB (negative: lower). Each is taken at its own ring: at the top of its spectrum there, or where none stands
// out, at its ring frequency; where nothing rings, at the bare ring's. It is the part of an emission that the network
// changes, not its level at a receiver.
//
// The spectrum is that of what is left to settle, v(t) - E, the transform of the circuit in the package comment at
// s = j w, with Ys = s Cs/(1 + s Rs Cs):
//
//	V(s) - E/s = (L I0 - E (s L + r) (C + Ys/s))/(1 + (s L + r)(s C + Ys))
//
// which is Kirchhoff's law with the pole of the bus's step at s = 0 taken out by hand. Derived here. A network with a
// diode is not linear and has no such form: ErrNetwork. A bare loop without loss rings for ever and has no level.
func RingLevel(l Loop, n Network, e Excitation) (db float64, err error) {
	bare, err := Respond(l, Network{Kind: Bare}, e)
	if err != nil {
		return 0, fmt.Errorf("level of the ring: %w", err)
	}
	fitted, err := Respond(l, n, e)
	if err != nil {
		return 0, fmt.Errorf("level of the ring: %w", err)
	}
	w, rings := bare.ringRad()
	switch {
	case e.Bus == 0 && e.Current == 0:
		return 0, errors.New("level of the ring: neither a bus voltage nor a loop current excites it; state one of them")
	case !rings:
		return 0, errors.New("level of the ring: the bare loop does not ring, its loss is too high; there is nothing to compare with")
	case l.Resistance == 0:
		return 0, errors.New("level of the ring: the bare loop has no loss and rings for ever; read decay_s, or state the loop's resistance")
	}
	own, ok := fitted.ringRad()
	if !ok {
		own = w
	}
	return 20 * math.Log10(top(l, n, e, own)/top(l, Network{Kind: Bare}, e, w)), nil
}

// ringRad is the damped ring frequency, rad/s.
func (r Response) ringRad() (w float64, ok bool) {
	hz, ok := r.RingHz()
	return 2 * math.Pi * hz, ok
}

// spectrum is the size of the transform of v(t) - E at w rad/s, V s.
func spectrum(l Loop, n Network, e Excitation, w float64) float64 {
	s := complex(0, w)
	branch := complex(l.Inductance, 0)*s + complex(l.Resistance, 0)
	c := complex(l.Capacitance, 0) + complex(n.C, 0)/(1+s*complex(n.SeriesOhm()*n.C, 0)) // C + Ys/s
	return cmplx.Abs((complex(l.Inductance*e.Current, 0) - complex(e.Bus, 0)*branch*c) / (1 + branch*s*c))
}

// top is the spectrum's local maximum within a factor of two of w, or where none stands out its value at w.
func top(l Loop, n Network, e Excitation, w float64) float64 {
	at := func(x float64) float64 { return spectrum(l, n, e, w*math.Exp2(x)) }
	const step = 1. / 32
	best, where := at(0), 0.0
	found := false
	for x := -1 + step; x < 1; x += step {
		if v := at(x); v >= at(x-step) && v >= at(x+step) && (!found || v > best) {
			best, where, found = v, x, true
		}
	}
	if !found {
		return best
	}
	// Golden section (Kiefer, Proc. Am. Math. Soc. 4, 502, 1953, from memory).
	const g = 0.6180339887498949
	lo, hi := where-step, where+step
	for range 50 {
		a, b := hi-g*(hi-lo), lo+g*(hi-lo)
		if at(a) > at(b) {
			hi = b
		} else {
			lo = a
		}
	}
	return at((lo + hi) / 2)
}
