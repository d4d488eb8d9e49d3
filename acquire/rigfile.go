package acquire

import (
	"errors"
	"fmt"
	"maps"
	"os"
	"slices"
	"strings"

	"github.com/BurntSushi/toml"

	"ringbook/snubber"
)

// LoadRig reads a rig file.
func LoadRig(path string) (Rig, error) {
	data, err := os.ReadFile(path)
	if errors.Is(err, os.ErrNotExist) {
		return Rig{}, fmt.Errorf("rig file %s: there is no such file: write one that names your instruments", path)
	}
	if err != nil {
		return Rig{}, fmt.Errorf("rig file: %w", err)
	}
	return ParseRig(path, data)
}

// The rig file as TOML has it. Pointers tell what is left out from what is zero.
type rigFile struct {
	Instrument map[string]instrumentFile `toml:"instrument"`
}

type instrumentFile struct {
	Address    string                 `toml:"address"`
	Timeout    *string                `toml:"timeout"`
	Terminator *string                `toml:"terminator"`
	ErrorQueue *bool                  `toml:"error_queue"`
	Pace       *string                `toml:"pace"`
	Prompt     *string                `toml:"prompt"`
	Echo       bool                   `toml:"echo"`
	Reopen     *string                `toml:"reopen"`
	SelfTest   *bool                  `toml:"self_test"`
	Follows    *string                `toml:"follows"`
	Setup      []string               `toml:"setup"`
	Fit        *string                `toml:"fit"`
	Reading    map[string]readingFile `toml:"reading"`
	Waveform   *waveformFile          `toml:"waveform"`
	Output     *outputFile            `toml:"output"`
}

type readingFile struct {
	Query    string       `toml:"query"`
	Scale    *float64     `toml:"scale"`
	Repeats  *int         `toml:"repeats"`
	Accuracy accuracyFile `toml:"accuracy"`
}

type accuracyFile struct {
	Percent float64 `toml:"percent"`
	Fixed   float64 `toml:"fixed"`
}

// ParseRig reads a rig file's text; name is for errors, which are *RigError and give the line. Unknown
// keys are errors. Instruments come out in the order of their names.
func ParseRig(name string, data []byte) (Rig, error) {
	var file rigFile
	meta, err := toml.Decode(string(data), &file)
	if err != nil {
		return Rig{}, syntaxError(name, err)
	}
	located := func(err error) error {
		var wrong *RigError
		if !errors.As(err, &wrong) {
			return err
		}
		return &RigError{File: name, Line: lineOf(string(data), strings.Split(wrong.Key, ".")), Key: wrong.Key, Err: wrong.Err}
	}
	if unknown := meta.Undecoded(); len(unknown) > 0 {
		key := unknown[0]
		return Rig{}, &RigError{File: name, Line: lineOf(string(data), key), Key: key.String(), Err: fmt.Errorf("there is no such key: %s", keysAt(key))}
	}
	var rig Rig
	for _, n := range slices.Sorted(maps.Keys(file.Instrument)) {
		in, err := file.Instrument[n].instrument(n)
		if err != nil {
			return Rig{}, located(err)
		}
		rig.Instruments = append(rig.Instruments, in)
	}
	if err := rig.Check(); err != nil {
		return Rig{}, located(err)
	}
	return rig, nil
}

func (f instrumentFile) instrument(name string) (Instrument, error) {
	in := Instrument{Name: name, Address: f.Address, Setup: f.Setup, NoErrorQueue: f.ErrorQueue != nil && !*f.ErrorQueue}
	if key, err := f.manners(&in); err != nil {
		return in, in.wrong(key, "%w", err)
	}
	if f.Fit != nil {
		if in.Fit = *f.Fit; in.Fit == "" {
			return in, in.wrong("fit", "it is empty: give the command, or take the key out")
		}
	}
	for _, quantity := range slices.Sorted(maps.Keys(f.Reading)) {
		r := f.Reading[quantity]
		q := Query{Quantity: snubber.Quantity(quantity), Query: r.Query, Accuracy: Accuracy(r.Accuracy)}
		if q.Query == "" && f.Follows != nil {
			var err error
			if q.Query, err = measureTree(q.Quantity); err != nil {
				return in, in.wrong("reading."+quantity, "%w", err)
			}
		}
		if r.Scale != nil {
			if q.Scale = *r.Scale; q.Scale == 0 {
				return in, in.wrong("reading."+quantity+".scale", "0: every reading would be nothing")
			}
		}
		if r.Repeats != nil {
			if q.Repeats = *r.Repeats; q.Repeats == 0 {
				return in, in.wrong("reading."+quantity+".repeats", "0: it must be 1 to 1000")
			}
		}
		in.Readings = append(in.Readings, q)
	}
	if f.Waveform != nil {
		w, key, err := f.Waveform.waveform()
		if err != nil {
			return in, in.wrong("waveform."+key, "%w", err)
		}
		in.Waveform = &w
	}
	if f.Output != nil {
		o, key, err := f.Output.output()
		if err != nil {
			return in, in.wrong("output."+key, "%w", err)
		}
		in.Output = &o
	}
	return in, nil
}

// keysAt lists the keys there are where an unknown one stands, for the cure.
func keysAt(key toml.Key) string {
	switch {
	case len(key) == 1:
		return "the file holds [instrument.NAME] tables"
	case len(key) == 3:
		return "an instrument has address, timeout, terminator, pace, prompt, echo, error_queue, self_test, reopen, setup, follows, fit, " +
			"[instrument.NAME.output], [instrument.NAME.waveform] and [instrument.NAME.reading.QUANTITY] tables"
	case len(key) > 3 && key[2] == "output":
		return "an output has on, off, state and settle"
	case len(key) > 3 && key[2] == "waveform":
		return "a waveform has take, query, format, byte_order, preamble, preamble_fields, scale, accuracy, " + strings.Join(scalings(), ", ")
	case len(key) == 5:
		return "a reading has query, scale, accuracy and repeats"
	}
	return "accuracy has percent and fixed"
}
