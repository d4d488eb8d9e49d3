package acquire

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"time"

	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
	"ringbook/snubber"
)

// DefaultRepeats is how often a quantity is read when the rig does not say.
const DefaultRepeats = 5

// Rig is the instruments and what to ask of them.
type Rig struct {
	Instruments []Instrument // at least one, names unique
}

// Instrument is one instrument of a rig.
type Instrument struct {
	Name         string        // the rig's own name for it: letters, digits, - and _
	Address      string        // as package wire reads it
	Timeout      time.Duration // longest wait for one reply; 0: scpi.DefaultTimeout
	Terminator   string        // what ends a message sent: "\n", "\r\n", "\r"; "": "\n"
	NoErrorQueue bool          // it does not know SYSTem:ERRor?
	Pace         time.Duration // least time between one message's end and the next one's beginning; 0: none
	Prompt       string        // what it writes before or behind its replies; "": nothing
	Echo         bool          // it repeats each message before it answers
	Reopen       time.Duration // how long a lost link is opened again; 0: DefaultReopen; below 0: it is not
	NoSelfTest   bool          // an instrument check does not ask for *TST?
	Setup        []string      // messages sent when the link is opened, and when it is opened again
	Fit          string        // the command that fits a network, with {network}, {c} and {r}; "": none
	Output       *BusSwitch    // how it switches the bus; nil: it does not
	Readings     []Query       // what it reads
	Waveform     *Waveform     // how its samples are had; nil: it gives none
}

// Query is how one quantity is read.
type Query struct {
	Quantity snubber.Quantity
	Query    string   // one query with its parameters, answered with one number
	Scale    float64  // what the answer is multiplied by to be in the quantity's unit; 0: 1
	Accuracy Accuracy // the instrument's stated bound; zero: not stated
	Repeats  int      // how often to ask, 1 to 1000; 0: DefaultRepeats
}

// Accuracy is a bound as data sheets state it: percent of reading plus a fixed amount.
type Accuracy struct {
	Percent float64 // of the reading, >= 0
	Fixed   float64 // in the quantity's unit, after scaling, >= 0
}

// Bound is the half-width of the interval the accuracy allows round v, in v's unit.
func (a Accuracy) Bound(v float64) float64 { return a.Percent/100*math.Abs(v) + a.Fixed }

// check gives the part that cannot be, by its key in the file.
func (a Accuracy) check() (key string, err error) {
	if v := a.Percent; !(v >= 0) || math.IsInf(v, 0) {
		return "accuracy.percent", fmt.Errorf("%g: it must be zero or a positive, finite number", v)
	}
	if v := a.Fixed; !(v >= 0) || math.IsInf(v, 0) {
		return "accuracy.fixed", fmt.Errorf("%g: it must be zero or a positive, finite number", v)
	}
	return "", nil
}

// RigError is the first thing in a rig that cannot be.
type RigError struct {
	File string // "" for a rig that was not read from a file
	Line int    // of the file; 0: not known
	Key  string // as the rig file writes it: instrument.scope.timeout
	Err  error
}

// Error names file, line and key.
func (e *RigError) Error() string {
	where := "rig"
	if e.File != "" {
		where = e.File
	}
	if e.Line > 0 {
		where = fmt.Sprintf("%s, line %d", where, e.Line)
	}
	if e.Key == "" {
		return fmt.Sprintf("%s: %v", where, e.Err)
	}
	return fmt.Sprintf("%s: %s: %v", where, e.Key, e.Err)
}

// Unwrap gives what is wrong at the key.
func (e *RigError) Unwrap() error { return e.Err }

// Check reports the first thing in the rig that cannot be, as a *RigError. Nothing is opened.
func (r Rig) Check() error {
	names := map[string]bool{}
	provider := map[snubber.Quantity]string{}
	ports := map[string]string{}
	fitter, sampler, switcher := "", "", ""
	for _, in := range r.Instruments {
		if names[in.Name] {
			return in.wrong("", "a second instrument of this name")
		}
		names[in.Name] = true
		if err := in.check(); err != nil {
			return err
		}
		for _, q := range in.Readings {
			if other, ok := provider[q.Quantity]; ok {
				return in.wrong("reading."+string(q.Quantity), "%s provides this reading already: take one of the two out", other)
			}
			provider[q.Quantity] = in.Name
		}
		if a, err := wire.Parse(in.Address); err == nil && a.Device != "" {
			if other, ok := ports[a.Device]; ok {
				return in.wrong("address", "%s is at this serial port already: give each its own, or make one instrument of the two", other)
			}
			ports[a.Device] = in.Name
		}
		if in.Fit != "" && fitter != "" {
			return in.wrong("fit", "%s fits networks already: take one of the two out", fitter)
		}
		if in.Fit != "" {
			fitter = in.Name
		}
		if in.Output != nil && switcher != "" {
			return in.wrong("output", "%s switches the bus already: take one of the two out", switcher)
		}
		if in.Output != nil {
			switcher = in.Name
		}
		if in.Waveform != nil && sampler != "" {
			return in.wrong("waveform", "%s takes the waveform already: take one of the two out", sampler)
		}
		if in.Waveform != nil {
			sampler = in.Name
		}
	}
	if len(provider) == 0 && sampler == "" {
		return &RigError{Err: fmt.Errorf("no instrument provides a reading: give at least one, as in [instrument.scope.reading.ring_hz]")}
	}
	return nil
}

func (in Instrument) wrong(key, format string, args ...any) *RigError {
	return &RigError{Key: strings.TrimSuffix("instrument."+in.Name+"."+key, "."), Err: fmt.Errorf(format, args...)}
}

func (in Instrument) check() error {
	if in.Name == "" || strings.Trim(in.Name, "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_") != "" {
		return in.wrong("", "instrument %q: a name is letters, digits, - and _", in.Name)
	}
	if in.Address == "" {
		return in.wrong("", "its address is missing: give one, as in address = \"tcp://host:5025\"")
	}
	if _, err := wire.Parse(in.Address); err != nil {
		return in.wrong("address", "%w", err)
	}
	if in.Timeout < 0 {
		return in.wrong("timeout", "%s: it must be longer than nothing", in.Timeout)
	}
	if !slices.Contains([]string{"", "\n", "\r\n", "\r"}, in.Terminator) {
		return in.wrong("terminator", "%q: it must be LF, CR LF or CR", in.Terminator)
	}
	if key, err := in.checkManners(); err != nil {
		return in.wrong(key, "%w", err)
	}
	for _, m := range in.Setup {
		if _, _, err := scpi.ParseUnit(m); err != nil {
			return in.wrong("setup", "%w", err)
		}
	}
	if in.Fit != "" {
		if _, err := fitMessage(in.Fit, snubber.Network{Kind: snubber.RC, C: 1e-9, R: 10}); err != nil {
			return in.wrong("fit", "%w", err)
		}
	}
	if in.Output != nil {
		if key, err := in.Output.check(); err != nil {
			return in.wrong(strings.TrimSuffix("output."+key, "."), "%w", err)
		}
	}
	for _, q := range in.Readings {
		if key, err := q.check(); err != nil {
			return in.wrong(strings.TrimSuffix("reading."+string(q.Quantity)+"."+key, "."), "%w", err)
		}
	}
	if in.Waveform != nil {
		if key, err := in.Waveform.check(); err != nil {
			return in.wrong(strings.TrimSuffix("waveform."+key, "."), "%w", err)
		}
	}
	return nil
}

// check gives the first field that cannot be, by its key in the file.
func (q Query) check() (key string, err error) {
	if !slices.Contains(snubber.Quantities(), q.Quantity) {
		var names []string
		for _, k := range snubber.Quantities() {
			names = append(names, string(k))
		}
		return "", fmt.Errorf("%q is no reading: there are %s", q.Quantity, strings.Join(names, ", "))
	}
	if q.Query == "" {
		return "", fmt.Errorf("its query is missing: give one, as in query = \"MEASure:FREQuency?\"")
	}
	if err := checkQuery(q.Query); err != nil {
		return "query", err
	}
	if math.IsNaN(q.Scale) || math.IsInf(q.Scale, 0) {
		return "scale", fmt.Errorf("%g: it must be a finite number", q.Scale)
	}
	if key, err := q.Accuracy.check(); err != nil {
		return key, err
	}
	if q.Repeats < 0 || q.Repeats > 1000 {
		return "repeats", fmt.Errorf("%d: it must be 1 to 1000", q.Repeats)
	}
	return "", nil
}
