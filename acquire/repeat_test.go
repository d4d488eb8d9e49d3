package acquire_test

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"ringbook/acquire"
	"ringbook/acquire/acquiretest"
	"ringbook/snubber"
)

func TestOutlierIsAskedOnceMore(t *testing.T) {
	ctx := context.Background()
	for name, c := range map[string]struct {
		replies  []string // of five repeats, and what may come behind
		accuracy acquire.Accuracy
		kept     int
		warning  string // "": none
	}{
		"one lies off":          {replies: []string{"62.00E6", "62.01E6", "70E6", "62.02E6", "61.99E6", "62.00E6"}, kept: 6, warning: "ring_hz: repeat 3, 7e+07, lies further off than the spread of the others allows; scope was asked once more and gave 6.2e+07; both are kept in the mean"},
		"and so does the next":  {replies: []string{"62.00E6", "62.01E6", "70E6", "62.02E6", "61.99E6", "71E6"}, kept: 6, warning: "gave 7.1e+07; both are kept"},
		"asked again, nothing":  {replies: []string{"62.00E6", "62.01E6", "70E6", "62.02E6", "61.99E6", "9.91E37"}, kept: 5, warning: "scope was asked once more and gave no reading"},
		"within the accuracy":   {replies: []string{"62.00E6", "62.01E6", "70E6", "62.02E6", "61.99E6"}, accuracy: acquire.Accuracy{Percent: 15}, kept: 5},
		"none lies off":         {replies: []string{"62.00E6", "62.01E6", "62.05E6", "62.02E6", "61.99E6"}, kept: 5},
		"the last digit":        {replies: []string{"62.0E6", "62.0E6", "62.1E6", "62.0E6", "62.0E6"}, kept: 5},
		"far from equal others": {replies: []string{"62.0E6", "62.0E6", "65E6", "62.0E6", "62.0E6", "62.0E6"}, accuracy: acquire.Accuracy{Percent: 1}, kept: 6, warning: "repeat 3, 6.5e+07"},
		"two hide each other":   {replies: []string{"62.00E6", "70E6", "70E6", "62.02E6", "61.99E6"}, kept: 5},
		"of four with one none": {replies: []string{"62.00E6", "9.91E37", "62.01E6", "62.02E6", "90E6", "62E6"}, kept: 5, warning: "repeat 4, 9e+07"},
	} {
		dev := scope()
		dev.Sequence["FREQ?"] = slices.Clone(c.replies)
		rig := rigOf(acquiretest.Serve(t, dev.Answer))
		rig.Instruments[0].Readings = []acquire.Query{{Quantity: snubber.RingHz, Query: "FREQ?", Accuracy: c.accuracy}}
		asked := 0
		got, err := openStation(t, rig).Take(ctx, func(p acquire.Progress) { asked = p.Repeat })
		if err != nil || len(got.Readings) != 1 {
			t.Errorf("%s: %+v, %v", name, got, err)
			continue
		}
		r := got.Readings[0]
		mean := 0.0
		for _, v := range r.Repeats {
			mean += v / float64(len(r.Repeats))
		}
		if len(r.Repeats) != c.kept || asked != len(c.replies) || !near(r.Value, mean, 1e-12) {
			t.Errorf("%s: %+v after %d questions; want %d kept, and their mean", name, r, asked, c.kept)
		}
		if all := strings.Join(got.Warnings, "\n"); !strings.Contains(all, c.warning) || c.warning == "" && strings.Contains(all, "lies") {
			t.Errorf("%s: warnings %q; want %q", name, all, c.warning)
		}
	}
}

// Repeats that are normally distributed have one asked once more in 1 % of rounds, whatever their number: 2000 rounds of
// each give 20, with a standard deviation of 4.4.
func TestOutlierFalseAlarms(t *testing.T) {
	noise := rand.New(rand.NewPCG(7, 7))
	for _, n := range []int{3, 5, 10, 30} {
		alarms := 0
		const rounds = 2000
		for range rounds {
			values := make([]float64, n)
			for i := range values {
				values[i] = 62e6 + 1e4*noise.NormFloat64()
			}
			if acquire.Outlier(values, acquire.Accuracy{}) >= 0 {
				alarms++
			}
		}
		t.Logf("%d repeats: %.2f %% of rounds", n, 100*float64(alarms)/rounds)
		if alarms < 5 || alarms > 40 {
			t.Errorf("%d repeats: %d false alarms in %d rounds; want about 20", n, alarms, rounds)
		}
	}
}

// Grubbs's critical values at 1 %, two-sided: G = |x - mean of all|/s of all. For n = 5 it is 1.764 and for n = 10 2.482
// (Grubbs and Beck, Technometrics 14, 1972, table I, upper 0.5 %) [from memory]. Just below it there is no outlier, just
// above there is one.
func TestOutlierAgainstGrubbs(t *testing.T) {
	for n, critical := range map[int]float64{5: 1.764, 10: 2.482} {
		lowest := 0.0
		for far := 1.0; far < 200; far *= 1.0005 {
			values := []float64{far * 10}
			for i := range n - 1 {
				values = append(values, float64(2*i-(n-2))) // symmetrical round nothing
			}
			if acquire.Outlier(values, acquire.Accuracy{}) == 0 {
				lowest = grubbs(values)
				break
			}
		}
		if !near(lowest, critical, 1e-3) {
			t.Errorf("%d repeats: an outlier from %.4f; the table has %.3f", n, lowest, critical)
		}
	}
}

func grubbs(values []float64) float64 {
	n, mean, squares := float64(len(values)), 0.0, 0.0
	for _, v := range values {
		mean += v / n
	}
	for _, v := range values {
		squares += (v - mean) * (v - mean)
	}
	return (values[0] - mean) / math.Sqrt(squares/(n-1))
}

// One trial is read from as many instruments as there are, each in its own way.
func TestSeveralInstruments(t *testing.T) {
	ctx := context.Background()
	text := &strings.Builder{}
	devices := map[string]*acquiretest.Instrument{}
	for name, body := range map[string]string{
		"scope":       "[instrument.scope.reading.ring_hz]\n[instrument.scope.reading.peak_v]\n[instrument.scope.reading.decay_s]\nquery = \"MEASure:DTIMe?\"\n",
		"counter":     "[instrument.counter.reading.switching_hz]\n",
		"supply":      "[instrument.supply.output]\non = \"OUTPut ON\"\noff = [\"OUTPut OFF\"]\n[instrument.supply.reading.supply_a]\n",
		"meter":       "[instrument.meter.reading.bus_v]\nrepeats = 2\n",
		"load":        "[instrument.load.reading.current_a]\nscale = -1\n",
		"thermometer": "[instrument.thermometer.reading.temp_c]\n",
	} {
		devices[name] = &acquiretest.Instrument{
			Identity: "Example Works," + name + ",1,1", Commands: map[string]string{"OUTPut OFF": ""},
			Answers: map[string]string{
				"MEASure:FREQuency?": "4.0E5", "MEASure:VOLTage:MAXimum?": "96", "MEASure:DTIMe?": "3.7E-8", "MEASure:VOLTage:DC?": "48",
				"MEASure:CURRent:DC?": "-1.5", "MEASure:TEMPerature?": "31", "*OPC?": "1",
			},
		}
		fmt.Fprintf(text, "[instrument.%s]\naddress = %q\nfollows = \"measure-tree\"\n%s", name, acquiretest.Serve(t, devices[name].Answer), body)
	}
	rig, err := acquire.ParseRig("rig.toml", []byte(text.String()))
	if err != nil {
		t.Fatal(err)
	}
	s := openStation(t, rig)
	got, err := s.Take(ctx, nil)
	if err != nil {
		t.Fatal(err)
	}
	var seen []string
	for _, r := range got.Readings {
		seen = append(seen, fmt.Sprintf("%s=%g of %s", r.Quantity, r.Value, strings.Split(r.Instrument, ",")[1]))
	}
	want := "ring_hz=400000 of scope, decay_s=3.7e-08 of scope, peak_v=96 of scope, bus_v=48 of meter, current_a=1.5 of load, supply_a=-1.5 of supply, switching_hz=400000 of counter, temp_c=31 of thermometer"
	if all := strings.Join(seen, ", "); all != want {
		t.Errorf("%s\nwant %s", all, want)
	}
	if err := s.Switch(ctx, false); err != nil {
		t.Error(err)
	}
}
