package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"time"

	"ringbook/acquire"
	"ringbook/acquire/wire"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/snubber/waveform"
)

// take fits the trial's network where the station can, and reads it.
func (a *app) take(ctx context.Context, station *acquire.Station, t snubber.Trial, captures int) (snubber.Trial, []waveform.Record, []string, error) {
	if station.CanFit() {
		if err := station.Fit(ctx, t.Network); err != nil {
			return t, nil, nil, once(err)
		}
	}
	return a.readTrial(ctx, station, t, captures, nil)
}

// readTrial reads every instrument, and gives the trial with its readings. With captures of the edge asked for, these come
// along, and the trial's ring, decay and peak are theirs. progress is the station's; nil is allowed.
func (a *app) readTrial(ctx context.Context, station *acquire.Station, t snubber.Trial, captures int, progress func(acquire.Progress)) (snubber.Trial, []waveform.Record, []string, error) {
	t.At = time.Now()
	var records []waveform.Record
	var warnings []string
	if captures > 0 {
		var err error
		if records, err = station.Capture(ctx, captures); err != nil {
			return t, nil, nil, once(err)
		}
		if warnings, err = fromCaptures(ctx, &t, records); err != nil {
			return t, nil, nil, err
		}
		for i := range t.Readings {
			if r := &t.Readings[i]; r.Quantity == snubber.PeakV {
				r.U = math.Hypot(r.U, station.CaptureAccuracy().Bound(r.Value)/math.Sqrt(3)) // a bound, as in GUM 4.3.7
			}
		}
	}
	if captures == 0 && len(station.Provides()) == 0 {
		return t, nil, nil, errors.New("the rig has no readings, only a waveform: add --waveform, or a table [instrument.NAME.reading.QUANTITY] to the rig file")
	}
	result, err := station.Take(ctx, progress)
	if err != nil {
		return t, nil, nil, once(err)
	}
	for _, r := range result.Readings {
		switch own, seen := t.Reading(r.Quantity); {
		case seen && math.Abs(own.Value-r.Value) > otherReading*own.Value:
			warnings = append(warnings, fmt.Sprintf("%s: the waveform gives %.4g and %s's own figure is %.4g, which is left out; look at what it triggers on", r.Quantity, own.Value, r.Instrument, r.Value))
		case seen:
		case captures > 0 && (r.Quantity == snubber.RingHz || r.Quantity == snubber.DecayS):
			warnings = append(warnings, fmt.Sprintf("%s: %s gives %.4g and the waveform none, so it is left out", r.Quantity, r.Instrument, r.Value))
		default:
			t.Readings = append(t.Readings, r)
		}
	}
	for _, w := range result.Warnings {
		quantity, _, _ := strings.Cut(w, " ")
		if r, ok := t.Reading(snubber.Quantity(strings.TrimSuffix(quantity, ":"))); ok && r.FromWaveform {
			continue // of a figure that the waveform has
		}
		warnings = append(warnings, w)
	}
	if len(t.Readings) == 0 {
		return t, nil, warnings, fmt.Errorf("no instrument gave a reading (%s)", strings.Join(warnings, "; "))
	}
	return t, records, warnings, nil
}

// otherReading is by how much of itself an instrument's own figure may differ from the waveform's before a word is said.
const otherReading = 0.05

// once leaves out what an error about a link that did not open would say twice: the address.
func once(err error) error {
	var fault *acquire.Fault
	var open *wire.OpenError
	if errors.As(err, &fault) && errors.As(err, &open) {
		return fmt.Errorf("instrument %s: %w", fault.Instrument, open)
	}
	return err
}

// describe is a network in words, as a person would say what is fitted.
func describe(n snubber.Network) string {
	c, r := quantity.Code(n.C, quantity.Capacitance), quantity.Code(n.R, quantity.Resistance)
	switch n.Kind {
	case snubber.Bare:
		return "bare"
	case snubber.C:
		return c
	case snubber.RCD:
		return r + " + " + c + ", diode across " + r
	}
	return r + " + " + c
}
