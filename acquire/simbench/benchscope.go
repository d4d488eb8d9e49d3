package simbench

import (
	"math/rand/v2"

	"ringbook/acquire/simbench/device"
)

// newScope makes the oscilloscope. MEASure takes a new capture and reads a figure from it; FETCh reads one from
// the capture kept last, which CAPTure:PREamble? and CAPTure:DATA? hand out:
//
//	CAPTure:PREamble?  points, time of the first sample (s), step (s), volts of the lowest code, volts per code, the
//	                   lowest code
//	CAPTure:DATA?      the samples, in the format set: UINTeger,8 at the start
//	CAPTure:FORMat     see samples
func (b *Bench) newScope() (*device.Instrument, error) {
	commands := append([]device.Command{
		{Header: "CAPTure[:TAKE]", Do: func([]device.Arg) (string, error) {
			_, err := b.capture()
			return "", err
		}},
	}, b.samples()...)
	for header, figure := range map[string]func(Figures) float64{
		"FREQuency":       func(f Figures) float64 { return f.RingHz },
		"RING:DECay":      func(f Figures) float64 { return f.DecayS },
		"VOLTage:MAXimum": func(f Figures) float64 { return f.PeakV },
		"VOLTage:HIGH":    func(f Figures) float64 { return f.SettledV },
	} {
		read := func(c Capture) string { return device.NR3(figure(c.Evaluate()), 6) }
		commands = append(commands,
			device.Command{Header: "MEASure[:SCALar]:" + header + "?", Do: func([]device.Arg) (string, error) {
				c, err := b.capture()
				if err != nil {
					return "", err
				}
				return read(c), nil
			}},
			device.Command{Header: "FETCh:" + header + "?", Do: b.fromKept(func(c Capture, _ sampleFormat) string { return read(c) })})
	}
	forget := func() {
		b.mu.Lock()
		defer b.mu.Unlock()
		b.kept, b.format = nil, startFormat
	}
	return device.New("RINGBOOK,SIMULATED SCOPE,0,1", forget, commands)
}

// capture takes a record of the board as it is now, and keeps it.
func (b *Bench) capture() (Capture, error) {
	b.mu.Lock()
	defer b.mu.Unlock()
	r, err := b.now()
	if err != nil {
		return Capture{}, device.Errorf(-240, "%v", err)
	}
	b.captures++
	scope, rng := b.model.cfg.Scope, rand.New(rand.NewPCG(b.model.cfg.Seed, b.captures))
	var c Capture
	if r == nil {
		c = scope.still(b.busV(), rng) // through the loop, the node stands at the bus voltage
	} else {
		c = scope.capture(r, rng)
	}
	b.kept = &c
	return c, nil
}

// fromKept makes a query that answers from the capture kept.
func (b *Bench) fromKept(answer func(Capture, sampleFormat) string) func([]device.Arg) (string, error) {
	return func([]device.Arg) (string, error) {
		b.mu.Lock()
		c, format := b.kept, b.format
		b.mu.Unlock()
		if c == nil {
			return "", device.Errorf(-230, "no capture is kept; send CAPTure first")
		}
		return answer(*c, format), nil
	}
}
