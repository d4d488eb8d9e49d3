package simbench

import (
	"strconv"
	"strings"

	"ringbook/acquire/simbench/device"
)

// newFixture makes what stands for the person at the bench: it fits a network across the switch and sets the
// electronic load, which also reads the load current.
//
//	FIXTure:FIT kind[,farad[,ohm]]   BARE | C | RC | RCD; values a kind does not have are left out or 0
//	FIXTure:FIT?                     the same, all three
//	FIXTure:LOAD ampere              FIXTure:LOAD?    MEASure:CURRent?
//	FIXTure:MISTakes?                how often parts were changed on a live bus, and the highest voltage they were; see
//	                                 Mistake
func (b *Bench) newFixture() (*device.Instrument, error) {
	strip := func() {
		b.mu.Lock()
		defer b.mu.Unlock()
		b.solder(Network{Kind: Bare})
		b.loadA = b.model.cfg.LoadA
	}
	return device.New("RINGBOOK,SIMULATED FIXTURE,0,1", strip, []device.Command{
		{Header: "FIXTure:FIT", Min: 1, Max: 3, Do: b.fit},
		{Header: "FIXTure:FIT?", Do: func([]device.Arg) (string, error) {
			b.mu.Lock()
			defer b.mu.Unlock()
			n := b.network
			return strings.ToUpper(string(n.Kind)) + "," + device.NR3(n.C, 9) + "," + device.NR3(n.R, 9), nil
		}},
		{Header: "FIXTure:LOAD", Min: 1, Max: 1, Do: b.set(func(v float64) error {
			if err := checkPoint(b.setV, v); err != nil {
				return err
			}
			b.loadA = v
			return nil
		})},
		b.ask("FIXTure:LOAD?", func() float64 { return b.loadA }),
		b.ask("MEASure[:SCALar]:CURRent[:DC]?", func() float64 {
			load := b.loadA
			if !b.output.on {
				load = 0
			}
			return b.read("fixture", b.model.cfg.MeterError, load)
		}),
		{Header: "FIXTure:MISTakes?", Do: func([]device.Arg) (string, error) {
			b.mu.Lock()
			defer b.mu.Unlock()
			highest := 0.0
			for _, m := range b.mistakes {
				highest = max(highest, m.BusV)
			}
			return strconv.Itoa(len(b.mistakes)) + "," + device.NR3(highest, 6), nil
		}},
	})
}

// fit runs FIXTure:FIT.
func (b *Bench) fit(args []device.Arg) (string, error) {
	word, err := args[0].Word()
	if err != nil {
		return "", err
	}
	n := Network{Kind: Kind(strings.ToLower(word))}
	for i, value := range []*float64{&n.C, &n.R} {
		if i+1 < len(args) {
			if *value, err = args[i+1].Number(); err != nil {
				return "", err
			}
		}
	}
	if err := n.Check(); err != nil {
		return "", device.Errorf(-224, "%v", err)
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	b.solder(n)
	return "", nil
}

// solder changes the network that is soldered in.
func (b *Bench) solder(n Network) {
	if n != b.network {
		b.touch()
	}
	b.network = n
}
