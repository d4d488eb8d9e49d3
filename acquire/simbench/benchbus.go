package simbench

import (
	"fmt"
	"math"
	"slices"
	"time"
)

// Bus is the bus capacitor and what fills and empties it.
type Bus struct {
	RiseS      float64 // s, >= 0: how long the supply, at its current limit, takes to fill it; 0: at once
	DischargeS float64 // s, >= 0: time constant with which it empties while the output is off; 0: at once
	SafeV      float64 // V, > 0: above this nobody should touch the board
	Speed      float64 // > 0: how many seconds of the bench pass in one of the clock on the wall
}

func (b Bus) check() error {
	switch {
	case !notNegative(b.RiseS) || b.RiseS > 3600, !notNegative(b.DischargeS) || b.DischargeS > 3600:
		return fmt.Errorf("bus that fills in %g s and empties with %g s: each must lie in 0 to 3600", b.RiseS, b.DischargeS)
	case !positive(b.SafeV):
		return fmt.Errorf("bus safe below %g V: it must be positive and finite", b.SafeV)
	case !(b.Speed > 0 && b.Speed <= 1e6):
		return fmt.Errorf("bench time at %g of the clock's: it must be above 0, up to a million", b.Speed)
	}
	return nil
}

// output is the state of the supply's output.
type output struct {
	on    bool
	since time.Duration // bench time of the switching
	fromV float64       // V: bus voltage then
}

// longOn is the state at the start: the bus has been filled before.
func longOn(cfg Config) output {
	return output{on: true, since: -time.Duration(cfg.Bus.RiseS * float64(time.Second)), fromV: cfg.BusV}
}

// busV is the voltage on the bus at this moment, V:
//
//	on    from + set (t/rise), up to set: the current limit of a supply charges a capacitor evenly
//	off   from exp(-t/tau): a bleeder
//
// With the output on, the supply takes the bus down to what it is set to at once.
func (b *Bench) busV() float64 {
	t, bus := (b.clock() - b.output.since).Seconds(), b.model.cfg.Bus
	switch {
	case b.output.on && t < bus.RiseS:
		return min(b.output.fromV+b.setV*t/bus.RiseS, b.setV)
	case b.output.on:
		return b.setV
	case bus.DischargeS == 0:
		return 0
	}
	return b.output.fromV * math.Exp(-t/bus.DischargeS)
}

// switchOutput switches the supply's output. The converter runs while it is on. Switching to what it is changes
// nothing: both laws of busV go on from any point as they would have.
func (b *Bench) switchOutput(on bool) {
	b.output = output{on: on, since: b.clock(), fromV: b.busV()}
}

// Mistake is a change of the parts across the switch while the bus was live.
type Mistake struct {
	At   time.Duration // bench time
	BusV float64       // V
}

// Mistakes are those made so far. A person at the bench makes none: the supply goes off, and the bus is let discharge,
// before a part is touched.
func (b *Bench) Mistakes() []Mistake {
	b.mu.Lock()
	defer b.mu.Unlock()
	return slices.Clone(b.mistakes)
}

// touch is a hand, or a relay, at the parts. Who read a voltage that is safe by a meter as wrong as the supply's is
// not to blame.
func (b *Bench) touch() {
	v := b.busV()
	if v > b.model.cfg.Bus.SafeV*(1+2*b.model.cfg.MeterError) {
		b.mistakes = append(b.mistakes, Mistake{At: b.clock(), BusV: v})
	}
}
