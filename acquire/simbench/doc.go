// Package simbench is a bench made of software: a switching node that rings, with parasitics the rest
// of the program does not know, and the instruments around it, which speak SCPI over TCP on loopback
// or over a pseudo-terminal.
//
// The board is integrated numerically: Dormand and Prince's embedded pair of orders 5 and 4 (J. Comput.
// Appl. Math. 6, 19, 1980) with dense output, a node capacitance that depends on its voltage, a switch
// current that falls in a finite time, and parts that are not what is printed on them. The scope samples
// that in 8 bits with noise, and reads its figures from its own samples.
//
//	E --- r --- L --- i -->--+------+-------+------- node, v
//	                         |      |       |
//	                     switch   C(v)   network: nothing, a capacitor, or a resistor (perhaps with a
//	                     i_sw(t)  + probe        diode across it) and a capacitor of voltage u
//	                         |      |       |
//	                         +------+-------+------- return
//
// It is the independent witness of the closed forms elsewhere in the program, so it shares no code with
// them: no package of the project is imported outside its tests, save its own device. It is not a
// circuit simulator either: one loop, one node; no ringing of the probe, no layout.
package simbench
