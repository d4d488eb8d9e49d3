package acquire

import (
	"context"
	"errors"
	"fmt"
	"io"

	"ringbook/acquire/scpi"
	"ringbook/snubber/waveform"
)

// ErrNoWaveform says that no instrument of the rig gives its samples.
var ErrNoWaveform = errors.New("no instrument of the rig gives a waveform: describe how its samples are had, in a table [instrument.NAME.waveform] with query, format, interval_s and volt_per_code")

// mostCaptures is the most that Capture makes at once.
const mostCaptures = 1000

// sampleError is what is wrong with a preamble or with samples, and what to do about it.
type sampleError struct{ problem, cure string }

func (e *sampleError) Error() string { return e.problem }

// unfit makes a sampleError.
func unfit(cure, problem string, args ...any) error {
	return &sampleError{fmt.Sprintf(problem, args...), cure}
}

// CanCapture says whether an instrument of the rig gives its samples.
func (s *Station) CanCapture() bool { return s.sampler() != nil }

// Capture makes n captures, 1 to 1000, one after another, and gives their samples. A record's Origin is the
// instrument's *IDN? answer, its StepV the voltage of the converter's step: of one code, or of the lowest bit ever set
// where 16-bit codes leave lower ones at zero; 0 for float32 and ASCII without volt_per_code.
//
// Without an instrument that gives samples the error is ErrNoWaveform. An instrument that refuses, is silent or sends
// what cannot be its samples ends it with a *Fault; no record is given then. The next exchange clears its link first. A
// lost link is opened again and the captures begun again from the first; see Station.
func (s *Station) Capture(ctx context.Context, n int) ([]waveform.Record, error) {
	in := s.sampler()
	if in == nil {
		return nil, ErrNoWaveform
	}
	if n < 1 || n > mostCaptures {
		return nil, fmt.Errorf("capture %d waveforms: it must be 1 to %d", n, mostCaptures)
	}
	if n > 1 && len(in.Waveform.Take) == 0 {
		return nil, in.fault(fmt.Sprintf("capture %d waveforms", n), unfit("give it in the rig file, as in take = \"CAPTure\"", "there is no take to make each anew, and the same capture might be read again"))
	}
	var records []waveform.Record
	err := s.again(ctx, func() error {
		records = nil
		for i := range n {
			r, err := in.capture(ctx)
			if err != nil {
				doing := "capture a waveform"
				if n > 1 {
					doing = fmt.Sprintf("capture waveform %d of %d", i+1, n)
				}
				return in.fault(doing, err)
			}
			records = append(records, r)
		}
		return nil
	})
	if err != nil {
		return nil, err
	}
	return records, nil
}

// CaptureAccuracy is what the rig states of the accuracy of captured volts; zero where it states none.
func (s *Station) CaptureAccuracy() Accuracy {
	if in := s.sampler(); in != nil {
		return in.Waveform.Accuracy
	}
	return Accuracy{}
}

func (s *Station) sampler() *instrument {
	for _, in := range s.instruments {
		if in.Waveform != nil {
			return in
		}
	}
	return nil
}

// capture makes one capture and reads it.
func (in *instrument) capture(ctx context.Context) (waveform.Record, error) {
	if err := in.ready(ctx); err != nil {
		return waveform.Record{}, err
	}
	w := in.Waveform
	for _, m := range w.Take {
		if err := in.send(ctx, m); err != nil {
			return waveform.Record{}, err
		}
	}
	c, err := in.calibrate(ctx)
	if err != nil {
		return waveform.Record{}, err
	}
	header, args, err := scpi.ParseUnit(w.Query)
	if err != nil {
		return waveform.Record{}, err
	}
	query := in.conn.QueryBlockTo
	if w.Format == ASCII {
		query = in.conn.QueryTextTo
	}
	d := decoder{format: w.Format, order: w.ByteOrder, calibration: c}
	err = query(ctx, func(body io.Reader, size int64) error { return d.decode(body, size) }, header, args...)
	if err != nil {
		return waveform.Record{}, err
	}
	r := waveform.Record{
		Start: c.startS - c.startSample*c.intervalS, Interval: c.intervalS,
		Volts: d.volts, StepV: c.step * d.codesPerStep(), Origin: in.identity,
	}
	first := r
	first.Volts = r.Volts[:1] // the decoder has seen to all of them
	if err := first.Check(); err != nil {
		return waveform.Record{}, unfit("check the scaling in the rig file", "%v", err)
	}
	return r, nil
}
