package simbench

import "strings"

// rigText is a rig file for the bench; each @NAME is an instrument's address. What it states as accuracy is what
// the data sheets of such instruments would: the scope's covers its eight bits and that a ring's frequency
// and decay depend a little on its size.
const rigText = `# The simulated bench. FIXTure:FIT does what a person with a soldering iron would.

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
`

// RigTOML is a rig file for this bench, with the addresses it is served at now.
func (b *Bench) RigTOML() string {
	text := rigText
	for name, address := range b.addresses {
		text = strings.ReplaceAll(text, `"@`+name+`"`, `"`+address+`"`)
	}
	return text
}
