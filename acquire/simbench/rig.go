package simbench

import (
	"fmt"
	"strings"
	"time"
)

// rigText is a rig file for the bench; each @NAME is an instrument's address, and @SETTLE a wait longer than the bus takes
// to rise. What it states as accuracy is what the data sheets of such instruments would: the scope's covers its
// eight bits and that a ring's frequency and decay depend a little on its size.
const rigText = `# The simulated bench. FIXTure:FIT does what a person with a soldering iron would; the relays switch capacitors in, as
# ROUTe:CLOSe (@1) does. Things go wrong on demand: send TROuble:DROP SCOPE,3 or the like to "@trouble"

[instrument.scope]
address = "@scope"

[instrument.scope.reading.ring_hz]
query    = "MEASure:FREQuency?"
accuracy = { percent = 0.3 }

[instrument.scope.reading.decay_s]
query    = "MEASure:RING:DECay?"
accuracy = { percent = 3 }

[instrument.scope.reading.peak_v]
query    = "MEASure:VOLTage:MAXimum?"
accuracy = { percent = 0.5, fixed = 0.3 }

[instrument.scope.waveform]
take            = "CAPTure"
query           = "CAPTure:DATA?"
format          = "uint8"
preamble        = "CAPTure:PREamble?"
preamble_fields = ["points", "start_s", "interval_s", "zero_v", "volt_per_code", "zero_code"]
accuracy        = { percent = 0.5, fixed = 0.1 }

[instrument.supply]
address = "@supply"

[instrument.supply.reading.bus_v]
query    = "MEASure:VOLTage:DC?"
accuracy = { percent = 0.1 }
repeats  = 2

[instrument.supply.reading.supply_a]
query    = "MEASure:CURRent:DC?"
accuracy = { percent = 0.1 }
repeats  = 2

[instrument.supply.output]
on     = "OUTPut ON"
off    = "OUTPut OFF"
state  = "OUTPut?"
settle = "@SETTLE"

[instrument.counter]
address = "@counter"

[instrument.counter.reading.switching_hz]
query    = "MEASure:FREQuency?"
accuracy = { percent = 0.005 }
repeats  = 2

[instrument.fixture]
address = "@fixture"
fit     = "FIXTure:FIT {network},{c},{r}"

[instrument.fixture.reading.current_a]
query    = "MEASure:CURRent:DC?"
accuracy = { percent = 0.1 }
repeats  = 2

[instrument.thermometer]
address = "@thermometer"

[instrument.thermometer.reading.temp_c]
query    = "MEASure:TEMPerature?"
accuracy = { fixed = 0.5 }
repeats  = 2

[instrument.relays]
address = "@relays"
`

// RigTOML is a rig file for this bench, with the addresses it is served at now.
func (b *Bench) RigTOML() string {
	bus := b.model.cfg.Bus
	settle := time.Duration(1.5 * bus.RiseS / bus.Speed * float64(time.Second)) // half as long again as the bus takes to rise
	text := strings.Replace(rigText, "@SETTLE", max(settle, time.Millisecond).Round(time.Millisecond).String(), 1)
	for name, address := range b.addresses {
		text = strings.ReplaceAll(text, "@"+name, address)
	}
	return text
}

// DrawerTOML is a drawer file of the capacitors that the bench's relay card switches in.
func (b *Bench) DrawerTOML() string {
	var text strings.Builder
	text.WriteString("# The capacitors of the simulated bench's relay card.\n")
	for i, c := range b.model.cfg.Relays {
		fmt.Fprintf(&text, `
[capacitor.K%d]
value      = "%.6gp"
tolerance  = "%.6g%%"
instrument = "relays"
switch     = "ROUTe:CLOSe (@%d)"
unswitch   = "ROUTe:OPEN (@%d)"
`, i+1, c*1e12, 100*b.model.cfg.Parts.CTol, i+1, i+1)
	}
	return text.String()
}
