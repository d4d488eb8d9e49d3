package main

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"time"

	"ringbook/acquire"
	"ringbook/acquire/wire"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// take fits the trial's network where the station can, reads every instrument, and gives the trial with its
// readings.
func (a *app) take(ctx context.Context, station *acquire.Station, t snubber.Trial) (snubber.Trial, []string, error) {
	if station.CanFit() {
		if err := station.Fit(ctx, t.Network); err != nil {
			return t, nil, once(err)
		}
	}
	t.At = time.Now()
	result, err := station.Take(ctx, nil)
	if err != nil {
		return t, nil, once(err)
	}
	if len(result.Readings) == 0 {
		return t, result.Warnings, fmt.Errorf("no instrument gave a reading (%s)", strings.Join(result.Warnings, "; "))
	}
	t.Readings = result.Readings
	return t, result.Warnings, nil
}

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
