package acquire

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"

	"ringbook/acquire/scpi"
)

// calibration is what makes times and voltages of samples; see Waveform.
type calibration struct {
	points                         float64 // how many samples there are; NaN: not said
	startS, startSample, intervalS float64
	zeroV, zeroCode, voltPerCode   float64
	scale                          float64
	step                           float64 // V from one code to the next, after scaling; 0: not known
}

// volt is the voltage of a code.
func (c *calibration) volt(code float64) float64 {
	return (c.zeroV + c.voltPerCode*(code-c.zeroCode)) * c.scale
}

// calibrate gathers the calibration of the capture that the instrument holds now.
func (in *instrument) calibrate(ctx context.Context) (calibration, error) {
	w := in.Waveform
	values := map[string]float64{points: math.NaN()}
	if w.Preamble != "" {
		if err := in.ask(ctx, w.Preamble, func(reply string) error { return readPreamble(reply, w.PreambleFields, values) }); err != nil {
			return calibration{}, err
		}
	}
	for _, name := range scalings() {
		s, ok := w.Scaling[name]
		if !ok {
			continue
		}
		values[name] = s.Value
		if s.Query == "" {
			continue
		}
		err := in.ask(ctx, s.Query, func(reply string) (err error) {
			values[name], err = readScaler(name, reply)
			return err
		})
		if err != nil {
			return calibration{}, err
		}
	}
	scale := w.Scale
	if scale == 0 {
		scale = 1
	}
	step := math.Abs(values["volt_per_code"] * scale)
	if step == 0 {
		values["volt_per_code"] = 1 // a format whose samples are volts, or Check had refused it
	}
	return calibration{
		points: values[points], startS: values["start_s"], startSample: values["start_sample"], intervalS: values["interval_s"],
		zeroV: values["zero_v"], zeroCode: values["zero_code"], voltPerCode: values["volt_per_code"], scale: scale, step: step,
	}, nil
}

// ask sends a query of the rig file and hands its reply to parse.
func (in *instrument) ask(ctx context.Context, query string, parse func(reply string) error) error {
	header, args, err := scpi.ParseUnit(query)
	if err != nil {
		return err
	}
	err = in.conn.QueryFunc(ctx, parse, header, args...)
	if errors.Is(err, scpi.ErrNoReading) {
		return unfit("have it capture first: give take in the rig file, and check its trigger", "the reply to %q: %v", query, err)
	}
	return err
}

// readPreamble puts the fields of a preamble into values by their names. Fields behind those that are named are of
// no use.
func readPreamble(reply string, names []string, values map[string]float64) error {
	fields := splitFields(reply)
	for len(names) > 0 && skipped(names[len(names)-1]) {
		names = names[:len(names)-1]
	}
	if len(fields) < len(names) {
		return unfit("check preamble_fields in the rig file against its programming manual", "it has %d fields, and preamble_fields names %d", len(fields), len(names))
	}
	for i, name := range names {
		if skipped(name) {
			continue
		}
		v, err := readScaler(name, fields[i])
		if errors.Is(err, scpi.ErrNoReading) {
			return fmt.Errorf("field %d, %s: %w", i+1, name, err)
		}
		if err != nil {
			return unfit("check preamble_fields in the rig file against its programming manual", "field %d, %s: %v", i+1, name, err)
		}
		values[name] = v
	}
	return nil
}

// readScaler reads one number of a calibration.
func readScaler(name, text string) (float64, error) {
	v, err := scpi.ParseNumber(text)
	switch {
	case errors.Is(err, scpi.ErrNoReading):
		return v, err
	case err != nil:
		return v, fmt.Errorf("%q is %w", text, err)
	case name == points && !(v >= 1 && v == math.Trunc(v)):
		return v, fmt.Errorf("%q: a number of samples is a whole one, 1 or more", text)
	}
	return v, checkScaler(name, v)
}

// splitFields splits at commas and semicolons outside quotes: instruments use either.
func splitFields(reply string) []string {
	var quote rune
	cuts := []int{-1}
	for i, c := range reply {
		switch {
		case quote != 0:
			if c == quote {
				quote = 0 // a doubled one opens again at once
			}
		case c == '"' || c == '\'':
			quote = c
		case c == ',' || c == ';':
			cuts = append(cuts, i)
		}
	}
	cuts = append(cuts, len(reply))
	var fields []string
	for i := range len(cuts) - 1 {
		fields = append(fields, strings.Trim(reply[cuts[i]+1:cuts[i+1]], " \t"))
	}
	return fields
}
