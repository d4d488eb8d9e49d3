// Package acquire turns instruments into readings: a rig file says which instruments there are and what
// to ask each of them, a [Station] asks, repeats, and gives each quantity as a mean with its standard
// uncertainty, or the samples of a capture as a waveform.
//
// It is not a logbook and not a driver: it stores nothing, and knows of an instrument only what the rig
// file says. The messages are those of package scpi, the links those of package wire.
//
// # The rig file
//
// A rig file is TOML. This one is complete; testdata/rig.toml is the same.
//
//	[instrument.scope]
//	address = "tcp://192.0.2.10:5025"  # or a VISA resource string; see package wire for all forms
//	timeout = "8s"                     # longest wait for one reply; 5s when left out
//	setup   = ["*CLS", "MEASure:SOURce CHANnel1"]  # sent when the link is opened
//
//	[instrument.scope.reading.ring_hz]
//	query    = "MEASure:FREQuency?"
//	accuracy = { percent = 0.01 }      # of the reading, as the data sheet has it: a bound, not k = 1
//	repeats  = 10                      # 5 when left out
//
//	[instrument.scope.reading.peak_v]
//	query    = "MEASure:VMAX?"
//	scale    = 10                      # what the answer is multiplied by: here a 10:1 probe it does not know
//	accuracy = { percent = 2, fixed = 0.4 }  # fixed is in the reading's unit, after scaling
//
//	[instrument.scope.reading.decay_s]
//	query = "MEASure:DTIMe?"
//
//	[instrument.scope.waveform]
//	take            = ["CAPTure", "*OPC?"]  # sent before each capture; one message may stand alone
//	query           = "CAPTure:DATA?"
//	format          = "int16"          # int8, uint8, int16, uint16, float32 or ascii
//	byte_order      = "big"            # of more than one byte: big or little, the end that comes first
//	preamble        = "CAPTure:PREamble?"
//	preamble_fields = ["points", "-", "interval_s", "start_s", "start_sample", "volt_per_code", "zero_v"]
//	zero_code       = "CAPTure:ZERO:CODE?"  # each may be a preamble's field, a query or a number
//	scale           = 10               # what volts are multiplied by, as above
//	accuracy        = { percent = 2, fixed = 0.4 }  # of volts, as above
//
//	[instrument.counter]
//	address = "TCPIP::192.0.2.11::5025::SOCKET"
//	follows = "measure-tree"           # it knows SCPI's MEASure tree: a reading may do without its query
//	reopen  = "1m"                     # how long a lost link is opened again; 30s when left out, 0s for not at all
//
//	[instrument.counter.reading.switching_hz]
//	accuracy = { percent = 0.005 }
//
//	[instrument.supply]
//	address    = "serial:///dev/ttyUSB0?baud=115200"
//	terminator = "crlf"                # ends what is sent: lf (when left out), crlf or cr
//	pace       = "20ms"                # least time between two messages, for one that is easily hurried
//	follows    = "measure-tree"
//
//	[instrument.supply.output]         # switched off for each swap
//	on     = ["VOLTage 48", "OUTPut ON"]  # a message, or several
//	off    = "OUTPut OFF"
//	state  = "OUTPut?"                 # asked whether it did switch: 1 or ON, 0 or OFF; may be left out
//	settle = "300ms"                   # from on to the first reading
//
//	[instrument.supply.reading.supply_a]
//	accuracy = { percent = 0.2, fixed = 0.005 }
//
//	[instrument.meter]
//	address = "serial:///dev/ttyUSB1?baud=9600&parity=even&data=7"
//	prompt  = ">"                      # what it writes round its replies
//	echo    = true                     # it repeats each message before it answers
//
//	[instrument.meter.reading.bus_v]   # read back until the bus is discharged, too
//	query    = "READ?"
//	accuracy = { percent = 0.1, fixed = 0.02 }
//	repeats  = 3
//
//	[instrument.load]
//	address   = "tcp://192.0.2.13:5025"
//	follows   = "measure-tree"
//	self_test = false                  # an instrument check does not ask for *TST?
//
//	[instrument.load.reading.current_a]
//	accuracy = { percent = 0.1, fixed = 0.005 }
//
//	[instrument.thermometer]
//	address = "tcp://192.0.2.14:5025"
//	follows = "measure-tree"
//
//	[instrument.thermometer.reading.temp_c]
//	query    = "MEASure:TEMPerature? TCouple,K"  # where the tree's own, MEASure:TEMPerature?, is not enough
//	accuracy = { fixed = 1.5 }
//	repeats  = 1
//
//	[instrument.jig]
//	address     = "tcp://192.0.2.12"
//	error_queue = false                # it does not know SYSTem:ERRor?; true when left out
//	fit         = "ROUTe:NETWork {network},{c},{r}"  # how a relay card puts a network in
//
// A reading's name is that of a [snubber.Quantity] and carries its unit. One instrument alone may provide
// a reading, the output, the waveform, or fit. In fit, {network} becomes bare, c, rc or rcd, {c} farads and {r} ohms
// (0.0E+00 where the network has none). Unknown keys are errors that name the line.
//
// With follows = "measure-tree", a reading without query is asked for by SCPI-1999, Volume 2, chapter 3, MEASure [from
// memory]:
//
//	ring_hz, switching_hz  MEASure:FREQuency?
//	peak_v                 MEASure:VOLTage:MAXimum?
//	bus_v                  MEASure:VOLTage:DC?
//	supply_a, current_a    MEASure:CURRent:DC?
//	temp_c                 MEASure:TEMPerature?
//	decay_s                none: give the instrument's own
//
// A reply may end with LF, CR LF or CR, whatever the terminator, and may begin with the header of its query. self_test
// is true when left out, but for an instrument with an output or fit, which a self-test might switch.
//
// # Faults
//
// A link that is dropped, or a serial adapter that is unplugged, is opened again, 100 ms after it was lost and then with
// waits that double, up to 3 s, for as long as reopen says. What comes then of before the fault is thrown away; the
// instrument must give the *IDN? answer of before; its setup is sent again, and what it fitted last. The round of readings or
// the captures begin again from their start, at most five times. After an instrument that did not answer in time, or answered
// with what is no reply, and gives its identity again when its link was cleared, they begin again once. An output is never switched for that: state tells
// whether it still is as it was switched. So setup should not switch it either, as *RST may.
//
// An instrument that refuses ends the round with a [*Fault]: its error queue in its own words, and the cure.
//
// Of three repeats or more, one that lies off by more than the others allow is asked once more, and both are kept: the
// mean is that of all, and its uncertainty shows it. The rule is Grubbs's test at 1 %: so often a round of honest,
// normally distributed repeats has one asked again. What lies within the stated accuracy is left alone.
//
// # Waveforms
//
// One instrument may give its samples. Sample i, counted from 0, and its code mean
//
//	t = start_s + (i - start_sample) interval_s
//	v = (zero_v + (code - zero_code) volt_per_code) scale
//
// Each of these but scale is a field of the preamble, a query of its own or a number, and 0 where it stands nowhere; but
// interval_s must stand somewhere, and volt_per_code for integers. Samples in float32 and ascii are volts: there
// volt_per_code is left out, whatever a preamble says of it. A preamble's fields are told apart by commas or
// semicolons; "-" is one of no use, and so are those behind the last that is named. Its points must be the number of
// samples that come.
//
// Samples come in an IEEE 488.2 block with a byte count, ASCII also as a line. The instrument's timeout bounds each
// silence in them, not the whole.
//
// # Uncertainty
//
// Of n repeats with the experimental standard deviation s, and an accuracy bound a (percent of the mean
// plus fixed), the standard uncertainty of the mean is
//
//	u = sqrt(s^2/n + a^2/3)
//
// the type A part by JCGM 100:2008 (GUM), 4.2.3, the type B part by 4.3.7 (a rectangular distribution of
// half-width a), added by 5.1.2.
package acquire
