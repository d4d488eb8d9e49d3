// Package acquiretest helps to test what talks to an instrument, without one: it records a dialogue
// over a real link, plays it back, and has a small instrument made of a table for tests that need a peer.
//
// A dialogue is a text file, one event a line, bytes quoted as Go strings are:
//
//	# whatever a person wants to note
//	> "*IDN?\n"
//	< "Example Works,Counter 1,0001,1.0\n"
//	! timeout
//
// A line > is what the client sent, < what it received, one line for each read; ! is a read that gave
// nothing: timeout, or closed. Nothing in it is timed: playback answers at once.
//
// It is not the simulated bench: its instrument knows nothing of a circuit.
package acquiretest
