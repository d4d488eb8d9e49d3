package acquire_test

import (
	"fmt"
	"strings"
	"testing"
	"time"

	"ringbook/acquire"
	"ringbook/acquire/simbench"
	"ringbook/acquire/simbench/device"
	"ringbook/snubber"
)

// Whatever the simulated scope does once, captures and readings come through, and the warnings say what happened. An
// error in its queue ends the work, in its own words.
func TestTroubles(t *testing.T) {
	bench, err := simbench.Start(t.Context(), simbench.Default())
	if err != nil {
		t.Fatal(err)
	}
	defer bench.Close()
	rig, err := acquire.ParseRig("rig.toml", []byte(bench.RigTOML()))
	if err != nil {
		t.Fatal(err)
	}
	for i := range rig.Instruments {
		rig.Instruments[i].Timeout = 700 * time.Millisecond
	}
	s := openStation(t, rig)
	var truth map[string]float64
	for _, c := range []struct {
		name string
		device.Trouble
	}{
		{"none", device.Trouble{}},
		{"drop", device.Trouble{Kind: device.Drop, After: 5}},
		{"drop for a while", device.Trouble{Kind: device.Drop, After: 30, For: time.Second}},
		{"silence", device.Trouble{Kind: device.Silence, After: 4, For: 2 * time.Second}},
		{"delay", device.Trouble{Kind: device.Delay, After: 20, For: time.Second}},
		{"cut", device.Trouble{Kind: device.Cut, After: 20}},
		{"cut block", device.Trouble{Kind: device.CutBlock, After: 2}},
		{"garbage", device.Trouble{Kind: device.Garbage, After: 20}},
		{"line", device.Trouble{Kind: device.Line, After: 20, Text: "8.8E+07"}},
		{"stale", device.Trouble{Kind: device.Stale, After: 21}},
	} {
		if c.name != "none" {
			if err := bench.Trouble("scope", c.Trouble); err != nil {
				t.Fatal(c.name, err)
			}
		}
		records, err := s.Capture(t.Context(), 2)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		got, err := s.Take(t.Context(), nil)
		if err != nil || len(records) != 2 {
			t.Errorf("%s: %d records, %v", c.name, len(records), err)
			continue
		}
		begun := strings.Contains(fmt.Sprint(got.Warnings), "begun again from its start")
		if begun != (c.name != "none") {
			t.Errorf("%s: warnings %q", c.name, got.Warnings)
		}
		read := map[string]float64{}
		for _, r := range got.Readings {
			read[string(r.Quantity)] = r.Value
		}
		if truth == nil {
			truth = read
		}
		for q, v := range truth {
			if !near(read[q], v, 0.05) {
				t.Errorf("%s: %s = %g; without trouble %g", c.name, q, read[q], v)
			}
		}
	}
	if err := bench.Trouble("scope", device.Trouble{Kind: device.Entry, Code: -310, Text: "fan"}); err != nil {
		t.Fatal(err)
	}
	if _, err := s.Take(t.Context(), nil); err == nil || !strings.Contains(err.Error(), "instrument error -310") || !strings.Contains(err.Error(), "fan") {
		t.Errorf("an error in its queue: %v", err)
	}
}

// A fixture whose link is lost and back is told again to fit its network, but never with the bus on.
func TestNoFitOnALiveBus(t *testing.T) {
	bench, err := simbench.Start(t.Context(), simbench.Default())
	if err != nil {
		t.Fatal(err)
	}
	defer bench.Close()
	rig, err := acquire.ParseRig("rig.toml", []byte(bench.RigTOML()))
	if err != nil {
		t.Fatal(err)
	}
	s := openStation(t, rig)
	var told []string
	s.Notify(func(m string) { told = append(told, m) })
	if err := s.Switch(t.Context(), false); err != nil {
		t.Fatal(err)
	}
	if err := s.Discharged(t.Context(), 5, 30*time.Second, nil); err != nil {
		t.Fatal(err)
	}
	if err := s.Fit(t.Context(), snubber.Network{Kind: snubber.C, C: 470e-12}); err != nil {
		t.Fatal(err)
	}
	for _, on := range []bool{true, false} {
		if err := s.Switch(t.Context(), on); err != nil {
			t.Fatal(err)
		}
		told = nil
		if err := bench.Trouble("fixture", device.Trouble{Kind: device.Drop, After: 1}); err != nil {
			t.Fatal(err)
		}
		if _, err := s.Take(t.Context(), nil); err != nil && on {
			t.Fatal(err)
		}
		if held := strings.Contains(strings.Join(told, "\n"), "not told again"); held != on || len(told) < 2 {
			t.Errorf("bus on %v: %q", on, told)
		}
	}
	if m := bench.Mistakes(); len(m) > 0 {
		t.Errorf("hot swaps: %+v", m)
	}
}
