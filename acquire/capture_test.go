package acquire_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"os"
	"strings"
	"testing"
	"time"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"

	"ringbook/acquire"
	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
	"ringbook/snubber/waveform"
)

// wave is a rig of one scope with a waveform in four bytes of the format given, by hand.
func wave(address string, format acquire.Format, order acquire.ByteOrder) acquire.Rig {
	return acquire.Rig{Instruments: []acquire.Instrument{{
		Name: "scope", Address: address, Timeout: 100 * time.Millisecond,
		Waveform: &acquire.Waveform{
			Take: []string{"ARM", "*OPC?"}, Query: "DATA?", Format: format, ByteOrder: order, Preamble: "PRE?",
			PreambleFields: []string{"points", "start_s", "interval_s", "-", "zero_v"},
			Scaling:        map[string]acquire.Scaler{"start_sample": {Value: 2}, "volt_per_code": {Query: "GAIN?"}, "zero_code": {Query: "ZERO?"}},
			Scale:          10,
		},
	}}}
}

// waveScope answers what wave asks: n samples, the second of which is at 1 us, every 0.5 us; 0.25 V a code, 3 V at code 1.
func waveScope(n int, data string) *acquiretest.Instrument {
	return &acquiretest.Instrument{
		Identity: scopeID,
		Answers: map[string]string{
			"*OPC?": "1", "PRE?": fmt.Sprintf(`%d,1E-6,5.0E-7,"BYTE, signed",3.0`, n), "GAIN?": "0.25", "ZERO?": "1", "DATA?": data,
		},
		Commands: map[string]string{"ARM": ""},
	}
}

// Each format and byte order by hand: bytes 01 80 FF 00 and 3E 80 00 00 (0.25 in IEEE 754 single precision), volts by
// (3 + (code - 1)/4) 10.
func TestCaptureFormats(t *testing.T) {
	const four = "\x01\x80\xff\x00"
	for name, c := range map[string]struct {
		format acquire.Format
		order  acquire.ByteOrder
		data   string
		codes  []float64
		step   float64 // V
	}{
		"uint8":              {acquire.Uint8, "", "#14" + four, []float64{1, 128, 255, 0}, 2.5},
		"int8":               {acquire.Int8, "", "#14" + four, []float64{1, -128, -1, 0}, 2.5},
		"uint16 big":         {acquire.Uint16, acquire.Big, "#14" + four, []float64{0x180, 0xff00}, 2.5 * 128},
		"uint16 little":      {acquire.Uint16, acquire.Little, "#14" + four, []float64{0x8001, 0xff}, 2.5},
		"int16 big":          {acquire.Int16, acquire.Big, "#14" + four, []float64{0x180, -256}, 2.5 * 128},
		"int16 little":       {acquire.Int16, acquire.Little, "#14" + four, []float64{-32767, 255}, 2.5},
		"int16 of nothing":   {acquire.Int16, acquire.Little, "#14\x00\x00\x00\x00", []float64{0, 0}, 2.5},
		"float32 big":        {acquire.Float32, acquire.Big, "#14\x3e\x80\x00\x00", []float64{0.25}, 2.5},
		"float32 little":     {acquire.Float32, acquire.Little, "#800000004\x00\x00\x80\xbe", []float64{-0.25}, 2.5},
		"line feeds":         {acquire.Uint8, "", "#13\n\n\n", []float64{10, 10, 10}, 2.5},
		"ascii line":         {acquire.ASCII, "", "1, -2.5E+0,.5", []float64{1, -2.5, 0.5}, 2.5},
		"ascii comma behind": {acquire.ASCII, "", "1,2,", []float64{1, 2}, 2.5},
		"ascii block":        {acquire.ASCII, "", "#171,+2,-3", []float64{1, 2, -3}, 2.5},
		"ascii lines":        {acquire.ASCII, "", "#211 1,\r\n2,\n+3\n", []float64{1, 2, 3}, 2.5},
		"ascii indefinite":   {acquire.ASCII, "", "#01,2", []float64{1, 2}, 2.5},
	} {
		t.Run(name, func(t *testing.T) {
			dev := waveScope(len(c.codes), c.data)
			s := openStation(t, wave(acquiretest.Serve(t, dev.Answer), c.format, c.order))
			want := waveform.Record{Start: 0, Interval: 5e-7, StepV: c.step, Origin: scopeID}
			for _, code := range c.codes {
				want.Volts = append(want.Volts, (3+(code-1)*0.25)*10)
			}
			got, err := s.Capture(context.Background(), 2)
			if err != nil || len(got) != 2 {
				t.Fatalf("%v, %v", got, err)
			}
			for _, r := range got {
				if d := cmp.Diff(want, r); d != "" {
					t.Error(d)
				}
			}
			if heard := strings.Join(dev.Heard(), " "); heard != strings.TrimSpace(strings.Repeat("ARM *OPC? PRE? ZERO? GAIN? DATA? ", 2)) {
				t.Errorf("heard %s", heard)
			}
		})
	}
}

// Without volt_per_code, floats and text are volts and the step is not known; without a preamble any number of samples will do.
func TestCaptureOfVolts(t *testing.T) {
	for format, data := range map[acquire.Format]string{acquire.ASCII: "1.5,2", acquire.Float32: "#18\x3f\xc0\x00\x00\x40\x00\x00\x00"} {
		rig := wave(acquiretest.Serve(t, waveScope(0, data).Answer), format, map[acquire.Format]acquire.ByteOrder{acquire.Float32: acquire.Big}[format])
		w := rig.Instruments[0].Waveform
		w.Preamble, w.PreambleFields, w.Scale, w.Take = "", nil, 0, nil
		w.Scaling = map[string]acquire.Scaler{"interval_s": {Value: 1e-9}}
		s := openStation(t, rig)
		got, err := s.Capture(context.Background(), 1)
		if err != nil || len(got) != 1 {
			t.Fatalf("%v, %v", got, err)
		}
		if d := cmp.Diff(waveform.Record{Interval: 1e-9, Volts: []float64{1.5, 2}, Origin: scopeID}, got[0]); d != "" {
			t.Error(d)
		}
		var fault *acquire.Fault
		if _, err := s.Capture(context.Background(), 2); !errors.As(err, &fault) || !strings.Contains(err.Error(), "the same capture might be read again: give it in the rig file") {
			t.Errorf("two captures without take: %v", err)
		}
	}
}

func TestCaptureFails(t *testing.T) {
	ctx := context.Background()
	for name, c := range map[string]struct {
		format acquire.Format
		answer map[string]string
		want   []string
	}{
		"odd bytes":          {acquire.Int16, map[string]string{"DATA?": "#15abcde"}, []string{`reply "#15" to "DATA?": 5 bytes are no whole number of int16 samples, which have 2 bytes each`, "check format in the rig file"}},
		"fewer samples":      {acquire.Uint8, map[string]string{"DATA?": "#13abc"}, []string{"3 samples of uint8 came, and the preamble promised 4 points", "check format and preamble_fields"}},
		"twice the samples":  {acquire.Uint8, map[string]string{"DATA?": "#18abcdefgh"}, []string{"8 samples of uint8 came, and the preamble promised 4 points"}},
		"fewer numbers":      {acquire.ASCII, map[string]string{"DATA?": "1,2,3"}, []string{`reply "1,2,3" to "DATA?": 3 samples of ascii came, and the preamble promised 4 points`}},
		"empty block":        {acquire.Uint8, map[string]string{"DATA?": "#10"}, []string{`reply "#10" to "DATA?": there are no samples in it`, "have it capture first"}},
		"empty text":         {acquire.ASCII, map[string]string{"DATA?": "#10"}, []string{"there are no samples in it"}},
		"text in numbers":    {acquire.ASCII, map[string]string{"DATA?": "1,2,OVER,4"}, []string{`sample 3 is "OVER", which is not a number`, "check format in the rig file"}},
		"hole in numbers":    {acquire.ASCII, map[string]string{"DATA?": "1,,3,4"}, []string{`sample 2 is "", which is not a number`}},
		"spaces for commas":  {acquire.ASCII, map[string]string{"DATA?": "1 2 3 4"}, []string{`sample 1 is "1 2 3 4", which is not a number`}},
		"no reading":         {acquire.ASCII, map[string]string{"DATA?": "1,9.91E37,3,4"}, []string{`sample 2 is no reading (the instrument answered "9.91E37")`, "check whether the trace has gaps"}},
		"hexadecimal":        {acquire.ASCII, map[string]string{"DATA?": "0x1p4,2,3,4"}, []string{`sample 1 is "0x1p4"`}},
		"binary for text":    {acquire.ASCII, map[string]string{"DATA?": strings.Repeat("\x80", 5000)}, []string{"sample 1 does not end: no comma in 4096 bytes"}},
		"text for a block":   {acquire.Uint8, map[string]string{"DATA?": "1,2,3,4"}, []string{`reply "1,2,3,4" to "DATA?": not a block: it does not begin with #`}},
		"indefinite":         {acquire.Uint8, map[string]string{"DATA?": "#0abcd"}, []string{"an indefinite block ends at the first line feed, which may be a sample", "set the instrument to blocks with a byte count"}},
		"count too small":    {acquire.Uint8, map[string]string{"DATA?": "#14abcdef"}, []string{`after the 4 bytes that its count promises came more, "ef\n"`}},
		"count too large":    {acquire.Uint8, map[string]string{"DATA?": "#14ab", "PRE?": `4,0,1,"",0`}, []string{"half a reply", "3 of the 4 bytes that its count promises had come", "check the cable"}},
		"count of gigabytes": {acquire.Uint8, map[string]string{"DATA?": "#9999999999ab"}, []string{"more than 67108864 samples", "have the instrument send fewer points"}},
		"not a number":       {acquire.Float32, map[string]string{"DATA?": "#216" + strings.Repeat("\x00\x00\x00\x00", 2) + "\x7f\xc0\x00\x00" + "\x00\x00\x00\x00"}, []string{"sample 3 is NaN", "check byte_order in the rig file"}},
		"infinite":           {acquire.Float32, map[string]string{"DATA?": "#216\xff\x80\x00\x00" + strings.Repeat("\x00\x00\x00\x00", 3)}, []string{"sample 1 is -Inf"}},
		"no sample there":    {acquire.Float32, map[string]string{"DATA?": "#216\x7e\x95\x1b\xc5" + strings.Repeat("\x00\x00\x00\x00", 3)}, []string{"sample 1 is 9.90"}},
		"preamble short":     {acquire.Uint8, map[string]string{"PRE?": "4,0,1E-9"}, []string{`reply "4,0,1E-9" to "PRE?": it has 3 fields, and preamble_fields names 5`, "check preamble_fields in the rig file"}},
		"preamble in words":  {acquire.Uint8, map[string]string{"PRE?": "4,0,fast,x,0"}, []string{`field 3, interval_s: "fast" is not a number`}},
		"interval 0":         {acquire.Uint8, map[string]string{"PRE?": "4,0,0,x,0"}, []string{"field 3, interval_s: 0: the time between two samples must be above zero"}},
		"interval negative":  {acquire.Uint8, map[string]string{"PRE?": "4,0,-1E-9,x,0"}, []string{"field 3, interval_s: -1e-09"}},
		"start none":         {acquire.Uint8, map[string]string{"PRE?": "4,9.91E37,1E-9,x,0"}, []string{`the reply to "PRE?": field 2, start_s: no reading`, "have it capture first"}},
		"points and a half":  {acquire.Uint8, map[string]string{"PRE?": "4.5,0,1E-9,x,0"}, []string{`field 1, points: "4.5": a number of samples is a whole one`}},
		"points 0":           {acquire.Uint8, map[string]string{"PRE?": "0,0,1E-9,x,0"}, []string{`field 1, points: "0": a number of samples`}},
		"gain 0":             {acquire.Uint8, map[string]string{"GAIN?": "0"}, []string{`reply "0" to "GAIN?": 0: every sample would be the same voltage`}},
		"gain NaN":           {acquire.Uint8, map[string]string{"GAIN?": "NaN"}, []string{`reply "NaN" to "GAIN?": "NaN" is not a number`}},
		"gain none":          {acquire.Uint8, map[string]string{"GAIN?": "9.91E37"}, []string{`the reply to "GAIN?": no reading`}},
		"gain enormous":      {acquire.ASCII, map[string]string{"GAIN?": "1E37", "DATA?": "1E35,1E37,-1E37,1E36", "ZERO?": "1E37"}, nil},
		"query unknown":      {acquire.Uint8, map[string]string{"DATA?": "-"}, []string{"instrument error -113", "check the rig file against its programming manual"}},
		"take unknown":       {acquire.Uint8, map[string]string{"*OPC?": "-"}, []string{`after "*OPC?"`}},
	} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			dev := waveScope(4, "#14abcd")
			for q, a := range c.answer {
				if dev.Answers[q] = a; a == "-" {
					delete(dev.Answers, q)
				}
			}
			order := acquire.ByteOrder("")
			if c.format == acquire.Int16 || c.format == acquire.Float32 {
				order = acquire.Big
			}
			address := acquiretest.Serve(t, dev.Answer)
			s := openStation(t, wave(address, c.format, order))
			got, err := s.Capture(ctx, 1)
			if c.want == nil { // far out, and yet numbers
				if err != nil || len(got) != 1 {
					t.Fatalf("%+v, %v", got, err)
				}
				return
			}
			var fault *acquire.Fault
			if !errors.As(err, &fault) || got != nil {
				t.Fatalf("%+v, %v", got, err)
			}
			for _, want := range append(c.want, "capture a waveform: instrument scope at "+address) {
				if !strings.Contains(err.Error(), want) {
					t.Errorf("%v\nwant it to say %s", err, want)
				}
			}
			if strings.Contains(err.Error(), "\n") || !utf8.ValidString(err.Error()) || len(err.Error()) > 500 {
				t.Errorf("the error is no sentence: %q", err.Error())
			}
			// The next round goes on as if nothing had been: the fault is the instrument's, not the link's.
			again, err2 := s.Capture(ctx, 1)
			if again != nil || err2 == nil || err2.Error() != err.Error() {
				t.Errorf("the next: %+v, %v\nwant %v", again, err2, err)
			}
		})
	}
}

// Voltages and times beyond all numbers.
func TestCaptureBeyond(t *testing.T) {
	for format, data := range map[acquire.Format]string{acquire.Uint8: "#14\x00bcd", acquire.ASCII: "0,98,3,4", acquire.Float32: "#216\x00\x00\x00\x00" + strings.Repeat("\x42\xc4\x00\x00", 3)} {
		for key, huge := range map[string]float64{"volt_per_code": 1e306, "start_sample": 1e308, "zero_v": 1e308} {
			rig := wave(acquiretest.Serve(t, waveScope(4, data).Answer), format, map[acquire.Format]acquire.ByteOrder{acquire.Float32: acquire.Big}[format])
			w := rig.Instruments[0].Waveform
			w.PreambleFields = []string{"points"}
			w.Scaling = map[string]acquire.Scaler{"interval_s": {Value: 1e9}, "volt_per_code": {Value: 1}}
			w.Scaling[key] = acquire.Scaler{Value: huge}
			got, err := openStation(t, rig).Capture(context.Background(), 1)
			if got != nil || err == nil || !strings.Contains(err.Error(), ": check the scaling in the rig file") {
				t.Errorf("%s with %s = %g: %+v, %v", format, key, huge, got, err)
			}
		}
	}
}

func TestCaptureRefuses(t *testing.T) {
	ctx := context.Background()
	dev := scope()
	s := openStation(t, rigOf(acquiretest.Serve(t, dev.Answer)))
	if _, err := s.Capture(ctx, 1); s.CanCapture() || !errors.Is(err, acquire.ErrNoWaveform) || !strings.Contains(err.Error(), "[instrument.NAME.waveform]") {
		t.Errorf("a rig without a waveform: %v", err)
	}
	s = openStation(t, wave(acquiretest.Serve(t, waveScope(4, "#14abcd").Answer), acquire.Uint8, ""))
	if !s.CanCapture() {
		t.Error("a rig with a waveform cannot capture")
	}
	for _, n := range []int{-1, 0, 1001} {
		if _, err := s.Capture(ctx, n); err == nil || !strings.Contains(err.Error(), fmt.Sprintf("capture %d waveforms: it must be 1 to 1000", n)) {
			t.Errorf("%d captures: %v", n, err)
		}
	}
	cancelled, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := s.Capture(cancelled, 1); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	// The third of four fails: nothing is given, and the error says which.
	flaky := waveScope(4, "#14abcd")
	flaky.Sequence = map[string][]string{"DATA?": {"#14abcd", "#14abcd", "#13abc"}}
	got, err := openStation(t, wave(acquiretest.Serve(t, flaky.Answer), acquire.Uint8, "")).Capture(ctx, 4)
	if got != nil || err == nil || !strings.Contains(err.Error(), "capture waveform 3 of 4: instrument scope") {
		t.Errorf("%v, %v", got, err)
	}
}

// A whole capture, played back from a file: the block comes in pieces with a line feed in it, its terminator doubled.
func TestCapturePlayedBack(t *testing.T) {
	f, err := os.Open("testdata/capture.txt")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	play := acquiretest.Playback(t, f)
	s, err := acquire.OpenWith(context.Background(), wave("tcp://192.0.2.10", acquire.Int16, acquire.Little),
		func(context.Context, string) (wire.Link, error) { return play, nil })
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	got, err := s.Capture(context.Background(), 1)
	if err != nil {
		t.Fatal(err)
	}
	// Codes 10, -1, 256, 2570 by (3 + (code - 1)/4) 10.
	want := []waveform.Record{{Start: 0, Interval: 5e-7, Volts: []float64{52.5, 25, 667.5, 6452.5}, StepV: 2.5, Origin: scopeID}}
	if d := cmp.Diff(want, got); d != "" {
		t.Error(d)
	}
}

// An instrument that stalls in the middle of its samples ends the capture after its timeout, not before.
func TestCaptureStalls(t *testing.T) {
	dev := waveScope(4, "#14ab")
	s := openStation(t, wave(acquiretest.Serve(t, func(m string) string { return strings.TrimSuffix(dev.Answer(m), "ab\n") }), acquire.Uint8, ""))
	_, err := s.Capture(context.Background(), 1)
	var link *scpi.LinkError
	if !errors.As(err, &link) || !link.Timeout() || !strings.Contains(err.Error(), "0 of the 4 bytes that its count promises had come: i/o timeout after 100ms: check the cable") {
		t.Errorf("%v", err)
	}
}

// BenchmarkCapture takes 10 million 8-bit samples over loopback TCP to volts.
func BenchmarkCapture(b *testing.B) {
	const n = 10_000_000
	dev := waveScope(n, fmt.Sprintf("#8%08d%s", n, strings.Repeat("\x0a\x80\x7f\xff", n/4)))
	s, err := acquire.Open(context.Background(), wave(acquiretest.Serve(b, dev.Answer), acquire.Uint8, ""))
	if err != nil {
		b.Fatal(err)
	}
	defer s.Close()
	b.SetBytes(n)
	for b.Loop() {
		got, err := s.Capture(context.Background(), 1)
		if err != nil || len(got[0].Volts) != n || math.IsNaN(got[0].Volts[0]) {
			b.Fatal(err)
		}
	}
}
