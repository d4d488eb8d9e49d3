package waveform_test

import (
	"encoding/csv"
	"errors"
	"io/fs"
	"math"
	"os"
	"strconv"
	"testing"

	"ringbook/snubber/waveform"
)

// The capacitor's voltage of a real series RLC after a pulse, measured by others (repository nicmontalti/RLC-Pulse, run 3.14;
// 2 us a sample, the drive still on in the first two). Two independent estimators give 9016.54 Hz and 6760.6 per second.
func TestRealPulse(t *testing.T) {
	file, err := os.Open("../../../shared/data/rlc_pulse.csv")
	if errors.Is(err, fs.ErrNotExist) && os.Getenv("RINGBOOK_CHECKS") != "all" {
		t.Skip("the measured file is not on this machine")
	} else if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	r := waveform.Record{Interval: 2e-6}
	for _, row := range rows[1:] {
		v, err := strconv.ParseFloat(row[1], 64)
		if err != nil {
			t.Fatal(err)
		}
		r.Volts = append(r.Volts, v)
	}
	for _, cut := range []int{0, 2} {
		e := readEdge(t, waveform.Record{Start: r.TimeAt(cut), Interval: r.Interval, Volts: r.Volts[cut:]})
		if !e.Ringing || e.DecayS == nil {
			t.Fatalf("without the first %d samples: no ring", cut)
		}
		t.Logf("without the first %d samples: %.2f(%.2f) Hz, %.1f per s", cut, e.RingHz.Value, e.RingHz.U, 1/e.DecayS.Value)
		near(t, "ring_hz", e.RingHz.Value, 9016.54, 5e-4)
		near(t, "1/decay_s", 1/e.DecayS.Value, 6760, 5e-3)
		if e.RingHz.Low > 9016.6 || e.RingHz.High < 9016.6 {
			t.Errorf("ring_hz %v does not hold the published 9016.6 Hz", *e.RingHz)
		}
		if math.Abs(e.PeakV.Value-0.1197348) > 1e-4 {
			t.Errorf("peak_v %v, the highest sample is 0.1197348 V", *e.PeakV)
		}
	}
}
