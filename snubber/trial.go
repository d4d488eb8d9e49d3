package snubber

import "time"

// Quantity names what a reading is of, with its unit, as the CSV and the logbook write it.
type Quantity string

// The quantities a trial may have read.
const (
	RingHz      Quantity = "ring_hz"      // the ring's frequency as seen (damped), Hz
	DecayS      Quantity = "decay_s"      // 1/e time of the ring's envelope, s
	PeakV       Quantity = "peak_v"       // the highest voltage across the switch, V
	BusV        Quantity = "bus_v"        // bus voltage, V
	CurrentA    Quantity = "current_a"    // load current, A
	SupplyA     Quantity = "supply_a"     // supply current, A
	SwitchingHz Quantity = "switching_hz" // switching frequency, Hz
	TempC       Quantity = "temp_c"       // temperature of a part or of the air, degree Celsius
)

// Quantities lists every quantity a reading may be of, in the order tables show them.
func Quantities() []Quantity {
	return []Quantity{RingHz, DecayS, PeakV, BusV, CurrentA, SupplyA, SwitchingHz, TempC}
}

// Reading is one quantity as read: its value in the unit of its name, and how well it is known.
type Reading struct {
	Quantity     Quantity
	Value        float64   // in the unit the quantity's name ends with
	U            float64   // standard uncertainty (k = 1), same unit; 0: not stated
	Repeats      []float64 // the single values behind Value, in the order read; nil for one value typed in
	Instrument   string    // the *IDN? answer of what read it; "" when a person typed it
	FromWaveform bool      // computed from captured samples, not by the instrument's own measurement
}

// OperatingPoint is what the converter was doing while a trial was read. Zero means not stated.
type OperatingPoint struct {
	BusV        float64 // V
	CurrentA    float64 // A: load current
	SwitchingHz float64 // Hz
}

// Trial is one network tried on one board revision at one operating point, with its readings.
type Trial struct {
	ID       string // UUIDv7 in its 36-character text form; "" until the logbook gives one
	Board    string
	Revision string
	At       time.Time // when it was read
	Session  string    // the sitting at the bench it belongs to; "" when none was named
	Network  Network
	Point    OperatingPoint
	ProbeC   float64 // F: the probe's capacitance across the node while reading
	Readings []Reading
	Part     string // what was fitted, in words: a drawer entry or a marking
	Note     string
	Struck   string // why the trial was marked as wrong; "" when it stands
}

// Reading gives the trial's reading of q; ok is false when q was not read.
func (t Trial) Reading(q Quantity) (r Reading, ok bool) {
	for _, r := range t.Readings {
		if r.Quantity == q {
			return r, true
		}
	}
	return Reading{}, false
}

// Operating is the operating point of the trial: what was stated, and where nothing was, what was read.
func (t Trial) Operating() OperatingPoint {
	p := t.Point
	for _, x := range []struct {
		v *float64
		q Quantity
	}{{&p.BusV, BusV}, {&p.CurrentA, CurrentA}, {&p.SwitchingHz, SwitchingHz}} {
		if r, ok := t.Reading(x.q); ok && *x.v == 0 {
			*x.v = r.Value
		}
	}
	return p
}
