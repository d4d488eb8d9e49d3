// Package snubber is the physics of a ringing switch and of the network that damps it: the loop's
// parasitics, the response of the loop with a network fitted, the fit of the parasitics to trials,
// and the recommendation of parts.
//
// The circuit is the one of a switch that lets go of a current. A bus of voltage E feeds, through the
// loop's inductance L and its loss resistance r, the switching node, whose capacitance C charges once
// the switch no longer carries the loop current I0. The network (nothing, a capacitor, a resistor and
// a capacitor in series) lies from the node to the return, in parallel with C.
//
//	E --- r --- L ---+--- node, v
//	                 |
//	          +------+------+
//	          C             R
//	          |             |
//	          |             Cs
//	          +------+------+
//	               return
//
// It is not a circuit simulator: one loop, one node, linear parts.
//
// Every value is in SI base units as a float64. Uncertainties are standard uncertainties (k = 1);
// intervals are 95 %.
package snubber
