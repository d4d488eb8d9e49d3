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
//	setup   = ["*CLS", "MEASure:SOURce CHANnel1"]  # sent once, when the rig is opened
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
//	[instrument.supply]
//	address    = "serial:///dev/ttyUSB0?baud=115200"
//	terminator = "crlf"                # ends what is sent: lf (when left out), crlf or cr
//
//	[instrument.supply.reading.bus_v]
//	query    = "MEASure:VOLTage:DC?"
//	accuracy = { percent = 0.1, fixed = 0.02 }
//	repeats  = 3
//
//	[instrument.jig]
//	address     = "tcp://192.0.2.12"
//	error_queue = false                # it does not know SYSTem:ERRor?; true when left out
//	fit         = "ROUTe:NETWork {network},{c},{r}"  # how a relay card puts a network in
//
// A reading's name is that of a [snubber.Quantity] and carries its unit. One instrument alone may provide
// a reading. In fit, {network} becomes bare, c, rc or rcd, {c} farads and {r} ohms (0.0E+00 where the
// network has none).
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
