package acquire

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"ringbook/acquire/scpi"
)

// Waveform is how an instrument's samples are had and what they mean. Sample i, from 0, and its code are
//
//	t = start_s + (i - start_sample) interval_s
//	v = (zero_v + (code - zero_code) volt_per_code) scale
//
// Each of these but scale is a number of the rig file, the answer to a query of its own, or a field of the preamble.
type Waveform struct {
	Take           []string // messages that make a capture, sent before each; none: the instrument captures by itself
	Query          string   // answered with the samples: a block, or for ASCII also a line
	Format         Format
	ByteOrder      ByteOrder         // of formats of more than one byte; "" for the others
	Preamble       string            // query answered with the fields below, commas or semicolons between; "": none
	PreambleFields []string          // what each field is: "points" or a key of Scaling; "" or "-": nothing of use
	Scaling        map[string]Scaler // by start_s, start_sample, interval_s, zero_v, zero_code, volt_per_code
	Scale          float64           // what volts are multiplied by, as for a reading; 0: 1
	Accuracy       Accuracy          // of volts, the instrument's stated bound; zero: not stated
}

// Scaler is a number, or the query that is answered with it.
type Scaler struct {
	Value float64
	Query string // "": Value is the number
}

// Format is how a sample is sent.
type Format string

// The formats there are. Integers in two's complement; float32 by IEEE 754.
const (
	Int8    Format = "int8"
	Uint8   Format = "uint8"
	Int16   Format = "int16"
	Uint16  Format = "uint16"
	Float32 Format = "float32"
	ASCII   Format = "ascii" // numbers with commas between
)

// ByteOrder says which byte of a sample comes first.
type ByteOrder string

// The orders there are: big has the most significant byte first.
const (
	Big    ByteOrder = "big"
	Little ByteOrder = "little"
)

// width is how many bytes a sample takes; 0: it varies.
func (f Format) width() int {
	return map[Format]int{Int8: 1, Uint8: 1, Int16: 2, Uint16: 2, Float32: 4}[f]
}

// codes says whether samples are codes of a converter, which mean nothing without a scaling.
func (f Format) codes() bool { return f.width() == 1 || f.width() == 2 }

// points is the preamble field that counts the samples.
const points = "points"

// scalings lists the keys of Scaling.
func scalings() []string {
	return []string{"start_s", "start_sample", "interval_s", "zero_v", "zero_code", "volt_per_code"}
}

// check gives the first field that cannot be, by its key in the file.
func (w Waveform) check() (key string, err error) {
	for _, m := range w.Take {
		if _, _, err := scpi.ParseUnit(m); err != nil {
			return "take", err
		}
	}
	if w.Query == "" {
		return "", fmt.Errorf("its query is missing: give the one that is answered with the samples, as in query = \"CAPTure:DATA?\"")
	}
	if err := checkQuery(w.Query); err != nil {
		return "query", err
	}
	switch {
	case w.Format == "":
		return "", fmt.Errorf("its format is missing: give int8, uint8, int16, uint16, float32 or ascii, and have setup set the instrument to it")
	case w.Format != ASCII && w.Format.width() == 0:
		return "format", fmt.Errorf("%q: it must be int8, uint8, int16, uint16, float32 or ascii", string(w.Format))
	case w.ByteOrder != "" && w.ByteOrder != Big && w.ByteOrder != Little:
		return "byte_order", fmt.Errorf("%q: it must be big, the most significant byte first, or little", string(w.ByteOrder))
	case w.Format.width() > 1 && w.ByteOrder == "":
		return "", fmt.Errorf("its byte_order is missing: %s needs big, the most significant byte first, or little", w.Format)
	case w.Format.width() <= 1 && w.ByteOrder != "":
		return "byte_order", fmt.Errorf("%s has none: take the key out", w.Format)
	case math.IsNaN(w.Scale) || math.IsInf(w.Scale, 0):
		return "scale", fmt.Errorf("%g: it must be a finite number", w.Scale)
	}
	if key, err := w.Accuracy.check(); err != nil {
		return key, err
	}
	if key, err := w.checkPreamble(); err != nil {
		return key, err
	}
	return w.checkScaling()
}

func (w Waveform) checkPreamble() (key string, err error) {
	if w.Preamble == "" && len(w.PreambleFields) == 0 {
		return "", nil
	}
	if w.Preamble == "" {
		return "preamble_fields", fmt.Errorf("there is no preamble whose fields they are: give its query, as in preamble = \"CAPTure:PREamble?\"")
	}
	if err := checkQuery(w.Preamble); err != nil {
		return "preamble", err
	}
	named := map[string]bool{}
	for _, f := range w.PreambleFields {
		switch {
		case skipped(f):
			continue
		case f != points && !slices.Contains(scalings(), f):
			return "preamble_fields", fmt.Errorf("%q is no field: there are points, %s, and - for one of no use", f, strings.Join(scalings(), ", "))
		case named[f]:
			return "preamble_fields", fmt.Errorf("%s stands there twice: put - for one of the two", f)
		}
		named[f] = true
	}
	if len(named) == 0 {
		return "preamble", fmt.Errorf("its preamble_fields name nothing: say what its fields are, as in preamble_fields = [\"points\", \"interval_s\"]")
	}
	return "", nil
}

// skipped says whether a preamble field is of no use.
func skipped(field string) bool { return field == "" || field == "-" }

func (w Waveform) checkScaling() (key string, err error) {
	known := map[string]bool{}
	for _, f := range w.PreambleFields {
		known[f] = true
	}
	for _, name := range scalings() {
		s, ok := w.Scaling[name]
		if !ok {
			continue
		}
		if known[name] {
			return name, fmt.Errorf("the preamble has it already: put - for it there, or take this key out")
		}
		known[name] = true
		if s.Query != "" {
			err = checkQuery(s.Query)
		} else {
			err = checkScaler(name, s.Value)
		}
		if err != nil {
			return name, err
		}
	}
	for name := range w.Scaling {
		if !slices.Contains(scalings(), name) {
			return name, fmt.Errorf("there is no such scaling: there are %s", strings.Join(scalings(), ", "))
		}
	}
	for _, name := range []string{"interval_s", "volt_per_code"} {
		if !known[name] && (name == "interval_s" || w.Format.codes()) {
			return "", fmt.Errorf("its %s is not known: give a number, a query as in %s = \"CAPTure:STEP?\", or name it in preamble_fields", name, name)
		}
	}
	return "", nil
}

// checkScaler says why a scaling cannot have this value.
func checkScaler(name string, v float64) error {
	switch {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return fmt.Errorf("%g: it must be a finite number", v)
	case name == "interval_s" && v <= 0:
		return fmt.Errorf("%g: the time between two samples must be above zero", v)
	case name == "volt_per_code" && v == 0:
		return fmt.Errorf("0: every sample would be the same voltage")
	}
	return nil
}

// checkQuery says why a message is no query.
func checkQuery(message string) error {
	header, _, err := scpi.ParseUnit(message)
	if err == nil && !scpi.IsQuery(header) {
		err = fmt.Errorf("%q is no query: its header must end in ?", message)
	}
	return err
}
