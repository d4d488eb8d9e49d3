package simbench

import (
	"math"

	"ringbook/acquire/simbench/device"
)

// newSupply makes the bench supply, which feeds the bus.
//
//	[SOURce]:VOLTage volt    OUTPut ON|OFF    MEASure:VOLTage?    MEASure:CURRent?
//
// The voltage measured is that of the bus, so it is seen falling while the output is off.
func (b *Bench) newSupply() (*device.Instrument, error) {
	off := func() {
		b.mu.Lock()
		defer b.mu.Unlock()
		b.switchOutput(false)
		b.setV = b.model.cfg.BusV
	}
	return device.New("RINGBOOK,SIMULATED SUPPLY,0,1", off, []device.Command{
		{Header: "[SOURce]:VOLTage[:LEVel][:IMMediate][:AMPLitude]", Min: 1, Max: 1, Do: b.set(func(v float64) error {
			if err := checkPoint(v, b.loadA); err != nil {
				return err
			}
			b.setV = v
			return nil
		})},
		b.ask("[SOURce]:VOLTage[:LEVel][:IMMediate][:AMPLitude]?", func() float64 { return b.setV }),
		{Header: "OUTPut[:STATe]", Min: 1, Max: 1, Do: func(args []device.Arg) (string, error) {
			on, err := args[0].Bool()
			if err != nil {
				return "", err
			}
			b.mu.Lock()
			defer b.mu.Unlock()
			b.switchOutput(on)
			return "", nil
		}},
		{Header: "OUTPut[:STATe]?", Do: func([]device.Arg) (string, error) {
			b.mu.Lock()
			defer b.mu.Unlock()
			if b.output.on {
				return "1", nil
			}
			return "0", nil
		}},
		b.ask("MEASure[:SCALar]:VOLTage[:DC]?", func() float64 {
			return b.read("supply", b.model.cfg.MeterError, b.busV())
		}),
		{Header: "MEASure[:SCALar]:CURRent[:DC]?", Do: func([]device.Arg) (string, error) {
			b.mu.Lock()
			defer b.mu.Unlock()
			amperes, err := b.supplyCurrent()
			if err != nil {
				return "", device.Errorf(-240, "%v", err)
			}
			return device.NR3(b.read("supply", b.model.cfg.MeterError, amperes), 6), nil
		}},
	})
}

// supplyCurrent is the converter's own share of the load current, and the charge that node and network take up
// in every cycle.
func (b *Bench) supplyCurrent() (float64, error) {
	r, err := b.now()
	if r == nil {
		return 0, err
	}
	return b.model.cfg.Board.Duty*b.loadA + b.model.cfg.SwitchingHz*r.charge, nil
}

// newCounter makes the frequency counter, which looks at the gate drive.
func (b *Bench) newCounter() (*device.Instrument, error) {
	return device.New("RINGBOOK,SIMULATED COUNTER,0,1", nil, []device.Command{
		{Header: "MEASure[:SCALar]:FREQuency?", Do: func([]device.Arg) (string, error) {
			b.mu.Lock()
			defer b.mu.Unlock()
			if !b.output.on {
				return device.NR3(math.NaN(), 0), nil
			}
			return device.NR3(b.read("counter", b.model.cfg.CounterPPM*1e-6, b.model.cfg.SwitchingHz), 9), nil
		}},
	})
}

// ask makes a query for one number of the bench's state.
func (b *Bench) ask(header string, value func() float64) device.Command {
	return device.Command{Header: header, Do: func([]device.Arg) (string, error) {
		b.mu.Lock()
		defer b.mu.Unlock()
		return device.NR3(value(), 6), nil
	}}
}

// set makes what a command with one number does; what change refuses is out of range.
func (b *Bench) set(change func(float64) error) func([]device.Arg) (string, error) {
	return func(args []device.Arg) (string, error) {
		v, err := args[0].Number()
		if err != nil {
			return "", err
		}
		b.mu.Lock()
		defer b.mu.Unlock()
		if err := change(v); err != nil {
			return "", device.Errorf(-222, "%v", err)
		}
		return "", nil
	}
}
