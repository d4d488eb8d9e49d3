package simbench

import (
	"fmt"
	"maps"
	"slices"
)

// Config is a whole bench: the board, what it does, the parts on hand and the instruments.
type Config struct {
	Board       Board
	BusV        float64 // V, >= 0: what the supply is set to at the start
	LoadA       float64 // A, >= 0: what the load is set to at the start
	SwitchingHz float64 // Hz, > 0
	ProbeF      float64 // F, >= 0: the scope probe's capacitance across the node
	Parts       Parts
	Scope       Scope
	MeterError  float64 // bound of the supply's and the load's own errors, a fraction of the reading; 0: none
	CounterPPM  float64 // bound of the counter's error, parts per million; 0: none
	Bus         Bus
	Heat        Heat
	Relays      []float64 // F, each in (0, 1e-6]: what channel 1, 2, ... of the relay card switches in, as printed on it
	Seed        uint64    // of the noise and the instruments' errors; the parts have their own
	// Ports gives the TCP port of an instrument by name (see Names); 0 or absent: any that is free.
	Ports map[string]int
}

// Default is an invented bench: the low-side switch of a 48 V step-down converter, rated 100 V, whose
// node rings at some 85 MHz with a quality of about ten and peaks a little below the rating.
func Default() Config {
	return Config{
		Board: Board{
			Inductance: 13.4e-9, Resistance: 0.72,
			FixedC: 180e-12, JunctionC: 150e-12, JunctionV: 9, Grading: 0.5,
			FallTime: 0.5e-9, BodyDrop: 0.8, BodyOhm: 0.05,
			PerLoadA: 1.1, Duty: 0.26,
		},
		BusV: 48, LoadA: 2.5, SwitchingHz: 400e3, ProbeF: 3.9e-12,
		Parts:      Parts{CTol: 0.02, RTol: 0.01, ESR: 0.03, DiodeDrop: 0.6, DiodeOhm: 0.15, Seed: 1},
		Scope:      Scope{RateHz: 5e9, Points: 2000, Before: 200, NoiseV: 0.6, SpanV: 160, BottomV: -20},
		MeterError: 5e-4, CounterPPM: 20, Seed: 1,
		Bus:    Bus{RiseS: 0.2, DischargeS: 0.5, SafeV: 5, Speed: 1},
		Heat:   Heat{AmbientC: 23, RiseKPerW: 30, ErrorK: 0.3},
		Relays: fiftyCapacitors(),
	}
}

// Check reports the first value that no bench can have.
func (c Config) Check() error {
	if err := c.Board.Check(); err != nil {
		return err
	}
	if err := c.Parts.check(); err != nil {
		return err
	}
	if err := c.Scope.check(); err != nil {
		return err
	}
	if err := checkPoint(c.BusV, c.LoadA); err != nil {
		return err
	}
	if err := c.Bus.check(); err != nil {
		return err
	}
	if err := c.Heat.check(); err != nil {
		return err
	}
	if err := checkRelays(c.Relays); err != nil {
		return err
	}
	switch {
	case !positive(c.SwitchingHz):
		return fmt.Errorf("switching frequency %g Hz: it must be positive and finite", c.SwitchingHz)
	case !notNegative(c.ProbeF):
		return fmt.Errorf("probe capacitance %g F: it must be zero or positive, and finite", c.ProbeF)
	case !(c.MeterError >= 0 && c.MeterError < 1):
		return fmt.Errorf("meter error %g: it is a fraction from 0 to 1", c.MeterError)
	case !(c.CounterPPM >= 0 && c.CounterPPM < 1e6):
		return fmt.Errorf("counter error %g ppm: it must lie in 0 to a million", c.CounterPPM)
	}
	for _, name := range slices.Sorted(maps.Keys(c.Ports)) {
		if !slices.Contains(Names(), name) {
			return fmt.Errorf("port for %q: the instruments are %v", name, Names())
		}
		if p := c.Ports[name]; p < 0 || p > 65535 {
			return fmt.Errorf("port %d for %q: it must lie in 0 to 65535", p, name)
		}
	}
	return nil
}

// The bounds keep an integration short; they lie far outside a bench.
const (
	mostVolts   = 2000.
	mostAmperes = 1000.
)

func checkPoint(bus, load float64) error {
	switch {
	case !(bus >= 0 && bus <= mostVolts):
		return fmt.Errorf("bus voltage %g V: it must lie in 0 to %g", bus, mostVolts)
	case !(load >= 0 && load <= mostAmperes):
		return fmt.Errorf("load current %g A: it must lie in 0 to %g", load, mostAmperes)
	}
	return nil
}
