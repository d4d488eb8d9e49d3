package recipes

import (
	"context"
	"fmt"

	"ringbook/snubber"
	"ringbook/snubber/waveform"
)

// Captured is what the captures of one edge show.
type Captured struct {
	waveform.Edge
	Captures int           `json:"captures"` // how many were averaged
	Samples  int           `json:"samples"`
	Interval float64       `json:"interval_s"`
	Origin   string        `json:"origin"`
	Line     *SpectralLine `json:"line"`   // the ring's line; null where none stands out
	Change   *LineChange   `json:"change"` // null where nothing was to be compared with

	Record   waveform.Record   `json:"-"` // what was read: the capture, or the mean of them
	Spectrum waveform.Spectrum `json:"-"`
}

// SpectralLine is a line of an amplitude spectrum.
type SpectralLine struct {
	Hz   float64 `json:"hz"`
	V    float64 `json:"v"`    // V rms of the sinusoid that gives it
	DBuV float64 `json:"dbuv"` // the same over 1 uV
}

// LineChange is how much the spectrum lies above another capture's at that one's ring.
type LineChange struct {
	Origin string  `json:"origin"` // of the other
	Hz     float64 `json:"hz"`     // of the other's ring
	DB     float64 `json:"db"`     // negative: lower than the other
}

// ReadCaptures averages captures of one edge, where there are more than one, and reads the mean.
func ReadCaptures(ctx context.Context, records []waveform.Record) (*Captured, error) {
	c := &Captured{Captures: len(records), Record: records[0]}
	var err error
	if len(records) > 1 {
		if c.Record, err = waveform.Average(records); err != nil {
			return nil, err
		}
	}
	if c.Edge, err = waveform.ReadEdge(ctx, c.Record, waveform.Options{}); err != nil {
		return nil, err
	}
	c.Samples, c.Interval, c.Origin = len(c.Record.Volts), c.Record.Interval, c.Record.Origin
	if len(c.Record.Volts) < 2 {
		return c, nil
	}
	if c.Spectrum, err = waveform.SpectrumOf(c.Record, waveform.Hann); err != nil {
		return nil, err
	}
	if c.RingHz != nil {
		if l, ok := c.Spectrum.Line(c.RingHz.Value); ok {
			c.Line = &SpectralLine{Hz: l.Hz, V: l.Volts, DBuV: waveform.DBuV(l.Volts)}
		}
	}
	return c, nil
}

// Against compares the spectrum with another capture's, at that one's ring.
func (c *Captured) Against(other *Captured) error {
	if other.RingHz == nil {
		return fmt.Errorf("comparing with %s: no ring stands out of it, so there is no line to compare at", other.Origin)
	}
	hz := other.RingHz.Value
	if other.Line != nil {
		hz = other.Line.Hz
	}
	db, err := waveform.DifferenceAt(other.Spectrum, c.Spectrum, hz)
	if err != nil {
		return fmt.Errorf("comparing with %s: %w", other.Origin, err)
	}
	c.Change = &LineChange{Origin: other.Origin, Hz: hz, DB: db}
	return nil
}

// Readings are the quantities a trial keeps, said to come from the waveform.
func (c *Captured) Readings() []snubber.Reading {
	var out []snubber.Reading
	for _, x := range []struct {
		q snubber.Quantity
		f *waveform.Figure
	}{{snubber.RingHz, c.RingHz}, {snubber.DecayS, c.DecayS}, {snubber.PeakV, c.PeakV}} {
		if x.f != nil {
			out = append(out, snubber.Reading{Quantity: x.q, Value: x.f.Value, U: x.f.U, Instrument: c.Origin, FromWaveform: true})
		}
	}
	return out
}
