package acquire_test

import (
	"bufio"
	"context"
	"errors"
	"io"
	"math"
	"net"
	"os"
	"strings"
	"testing"
	"time"

	"ringbook/acquire"
	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
	"ringbook/acquire/wire"
	"ringbook/snubber"
)

const scopeID = "Example Works,Scope 2,0007,2.1"

func scope() *acquiretest.Instrument {
	return &acquiretest.Instrument{
		Identity: scopeID,
		Answers:  map[string]string{"VMAX?": "9.5E+00"},
		Sequence: map[string][]string{"FREQ?": {"6.1E+7", "6.2E+7", "6.3E+7", "6.2E+7"}},
		Commands: map[string]string{"MODE RING": "", "FIT rc,4.7E-10,1.0E+01": "", "FIT bare,0.0E+00,0.0E+00": ""},
	}
}

func rigOf(address string) acquire.Rig {
	return acquire.Rig{Instruments: []acquire.Instrument{{
		Name: "scope", Address: address, Timeout: time.Second, Setup: []string{"MODE RING"}, Fit: "FIT {network},{c},{r}",
		Readings: []acquire.Query{
			{Quantity: snubber.PeakV, Query: "VMAX?", Scale: 10, Accuracy: acquire.Accuracy{Percent: 2, Fixed: 0.1}, Repeats: 1},
			{Quantity: snubber.RingHz, Query: "FREQ?", Accuracy: acquire.Accuracy{Percent: 0.1}, Repeats: 4},
		},
	}}}
}

func openStation(t *testing.T, rig acquire.Rig) *acquire.Station {
	t.Helper()
	s, err := acquire.Open(context.Background(), rig)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { s.Close() })
	return s
}

func near(got, want, rel float64) bool { return math.Abs(got-want) <= rel*math.Abs(want) }

func TestTake(t *testing.T) {
	dev := scope()
	s := openStation(t, rigOf(acquiretest.Serve(t, dev.Answer)))
	if s.Identity("scope") != scopeID || s.Identity("none") != "" {
		t.Errorf("identity %q", s.Identity("scope"))
	}
	var seen []acquire.Progress
	got, err := s.Take(context.Background(), func(p acquire.Progress) { seen = append(seen, p) })
	if err != nil {
		t.Fatal(err)
	}
	if len(got.Readings) != 2 || len(got.Warnings) != 0 {
		t.Fatalf("%+v", got)
	}
	// By hand: mean 62 MHz; s^2 = (1+0+1+0)/3 MHz^2, so s^2/4 = 1/6 MHz^2; a = 0.062 MHz;
	// u = sqrt(1/6 + 0.062^2/3) = 0.409815 MHz.
	ring := got.Readings[0]
	if ring.Quantity != snubber.RingHz || !near(ring.Value, 62e6, 1e-15) || !near(ring.U, 0.4098146e6, 1e-6) || len(ring.Repeats) != 4 || ring.Repeats[2] != 63e6 || ring.Instrument != scopeID {
		t.Errorf("%+v", ring)
	}
	// By hand: 9.5 times 10 is 95 V; a = 1.9 + 0.1 = 2 V; u = 2/sqrt(3) = 1.154701 V.
	peak := got.Readings[1]
	if peak.Quantity != snubber.PeakV || peak.Value != 95 || !near(peak.U, 1.1547005, 1e-7) || len(peak.Repeats) != 1 {
		t.Errorf("%+v", peak)
	}
	if len(seen) != 5 || seen[1].Repeat != 2 || seen[1].Repeats != 4 || seen[1].Value != 62e6 || seen[4].Quantity != snubber.PeakV {
		t.Errorf("progress %+v", seen)
	}
	if heard := dev.Heard(); heard[0] != "MODE RING" || len(heard) != 6 {
		t.Errorf("heard %q", heard)
	}
}

func TestTakeWithoutReading(t *testing.T) {
	const none = "9.91E+37"
	for _, c := range []struct {
		replies []string
		value   float64 // 0: absent
		warning string
	}{
		{[]string{none, none, none, none}, 0, "ring_hz is left out: scope gave no reading in 4 of 4 repeats"},
		{[]string{none, "6.2E7", none, none}, 0, "in 3 of 4 repeats"},
		{[]string{none, "6.2E7", "6.4E7", "-9.9E37"}, 63e6, "in 2 of 4 repeats; the value is the mean of the other 2"},
		{[]string{"6.2E7", "6.2E7", "6.2E7", "6.2E7"}, 62e6, "uncertainty is not known"},
		{[]string{"6.1E7", "6.1E7", "6.1E7", "6.3E7"}, 61.5e6, ""},
	} {
		dev := scope()
		dev.Sequence["FREQ?"] = c.replies
		rig := rigOf(acquiretest.Serve(t, dev.Answer))
		rig.Instruments[0].Readings[1].Accuracy = acquire.Accuracy{}
		got, err := openStation(t, rig).Take(context.Background(), nil)
		if err != nil {
			t.Fatal(err)
		}
		if all := strings.Join(got.Warnings, "\n"); !strings.Contains(all, c.warning) || c.warning == "" && all != "" {
			t.Errorf("%q: warnings %q; want %q", c.replies, all, c.warning)
		}
		if r := got.Readings[0]; (r.Quantity == snubber.RingHz) != (c.value != 0) || c.value != 0 && r.Value != c.value {
			t.Errorf("%q: %+v; want %g", c.replies, r, c.value)
		}
	}
}

func TestTakeFails(t *testing.T) {
	ctx := context.Background()
	for name, c := range map[string]struct {
		reply string
		want  []string
	}{
		"negative frequency": {"-6.2E+7", []string{`reply "-6.2E+7" to "FREQ?" is ring_hz = -6.2e+07`, "check the trigger"}},
		"zero frequency":     {"0", []string{`reply "0"`}},
		"words":              {"HELLO", []string{`reply "HELLO" to "FREQ?": not a number`, "check that the address"}},
	} {
		dev := scope()
		dev.Sequence["FREQ?"] = []string{"6.2E7", c.reply}
		if name == "words" {
			dev.Sequence["FREQ?"] = []string{"6.2E7", c.reply, "6.2E7", c.reply} // once might be an accident
		}
		dev.Answers["FREQ?"] = "6.2E7"
		address := acquiretest.Serve(t, dev.Answer)
		s := openStation(t, rigOf(address))
		_, err := s.Take(ctx, nil)
		var fault *acquire.Fault
		if !errors.As(err, &fault) || fault.Instrument != "scope" {
			t.Fatalf("%s: %v", name, err)
		}
		for _, want := range append(c.want, "read ring_hz: instrument scope at "+address) {
			if !strings.Contains(err.Error(), want) {
				t.Errorf("%s: %v\nwant it to say %s", name, err, want)
			}
		}
		// The next round goes on as if nothing had been.
		if got, err := s.Take(ctx, nil); err != nil || got.Readings[0].Value != 62e6 {
			t.Errorf("%s: the next round: %+v, %v", name, got, err)
		}
	}
}

func TestTakeRefusedAndSilent(t *testing.T) {
	ctx := context.Background()
	dev := scope()
	rig := rigOf(acquiretest.Serve(t, dev.Answer))
	rig.Instruments[0].Timeout = 50 * time.Millisecond
	rig.Instruments[0].Readings[1].Query = "WRONG?"
	_, err := openStation(t, rig).Take(ctx, nil)
	var refused *scpi.InstrumentError
	if !errors.As(err, &refused) || !strings.Contains(err.Error(), "-113") || !strings.Contains(err.Error(), "check the rig file against its programming manual") {
		t.Errorf("refused: %v", err)
	}
	silent := rigOf(acquiretest.Serve(t, func(m string) string {
		if m == "FREQ?" {
			time.Sleep(200 * time.Millisecond) // longer than the timeout and its probe
			return ""
		}
		return scope().Answer(m)
	}))
	silent.Instruments[0].Timeout = 50 * time.Millisecond
	_, err = openStation(t, silent).Take(ctx, nil)
	var link *scpi.LinkError
	if !errors.As(err, &link) || !link.Timeout() || !strings.Contains(err.Error(), "a longer timeout in the rig file") {
		t.Errorf("silent: %v", err)
	}
	cancelled, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := openStation(t, rigOf(acquiretest.Serve(t, scope().Answer))).Take(cancelled, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

func TestFit(t *testing.T) {
	ctx := context.Background()
	dev := scope()
	rig := rigOf(acquiretest.Serve(t, dev.Answer))
	s := openStation(t, rig)
	if err := s.Fit(ctx, snubber.Network{Kind: snubber.RC, C: 470e-12, R: 10}); err != nil {
		t.Error(err)
	}
	if err := s.Fit(ctx, snubber.Network{Kind: snubber.Bare}); err != nil {
		t.Error(err)
	}
	if err := s.Fit(ctx, snubber.Network{Kind: snubber.C, C: -1}); err == nil || !strings.Contains(err.Error(), "positive capacitance") {
		t.Errorf("a negative capacitor: %v", err)
	}
	if err := s.Fit(ctx, snubber.Network{Kind: snubber.C, C: 1e-9}); err == nil || !strings.Contains(err.Error(), "-113") {
		t.Errorf("a network the jig has not: %v", err)
	}
	want := []string{"MODE RING", "FIT rc,4.7E-10,1.0E+01", "FIT bare,0.0E+00,0.0E+00", "FIT c,1.0E-09,0.0E+00"}
	if got := dev.Heard(); strings.Join(got, "|") != strings.Join(want, "|") {
		t.Errorf("heard %q", got)
	}
	rig.Instruments[0].Fit = ""
	if s := openStation(t, rig); s.CanFit() || !errors.Is(s.Fit(ctx, snubber.Network{Kind: snubber.Bare}), acquire.ErrNoFitter) {
		t.Error("a rig without a fit command fitted a network")
	}
}

func TestOpenFails(t *testing.T) {
	ctx := context.Background()
	for name, c := range map[string]struct {
		answer func(string) string
		want   string
	}{
		"no instrument": {func(string) string { return "HTTP/1.1 400 Bad Request\r\n" }, "not an instrument's identity"},
		"setup refused": {func() func(string) string { d := scope(); d.Commands = nil; return d.Answer }(), "setup: instrument error -113"},
	} {
		address := acquiretest.Serve(t, c.answer)
		_, err := acquire.Open(ctx, rigOf(address))
		var fault *acquire.Fault
		if !errors.As(err, &fault) || !strings.Contains(err.Error(), "open: instrument scope at "+address) || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v", name, err)
		}
	}
	_, err := acquire.Open(ctx, rigOf("tcp://127.0.0.1:1"))
	var open *wire.OpenError
	if !errors.As(err, &open) || !strings.Contains(err.Error(), "connection refused") {
		t.Errorf("refused: %v", err)
	}
	if _, err := acquire.Open(ctx, acquire.Rig{}); err == nil {
		t.Error("an empty rig was opened")
	}
}

// What was there before the session is not this session's: an old error in the queue, a greeting.
func TestOpenPastOldTrouble(t *testing.T) {
	dev := scope()
	dev.Answer("NONSENSE")
	openStation(t, rigOf(acquiretest.Serve(t, dev.Answer)))
	first := true
	greeter := scope()
	openStation(t, rigOf(acquiretest.Serve(t, func(m string) string {
		reply := greeter.Answer(m)
		if first {
			first = false
			return "Welcome\n" + reply
		}
		return reply
	})))
}

// A whole session, played back from a file: open, one round, fit.
func TestSessionPlayedBack(t *testing.T) {
	ctx := context.Background()
	f, err := os.Open("testdata/session.txt")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	play := acquiretest.Playback(t, f)
	s, err := acquire.OpenWith(ctx, rigOf("tcp://192.0.2.10"), func(context.Context, string) (wire.Link, error) { return play, nil })
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	got, err := s.Take(ctx, nil)
	if err != nil || len(got.Readings) != 2 || got.Readings[0].Value != 62e6 || got.Readings[1].Value != 95 {
		t.Errorf("%+v, %v", got, err)
	}
	if err := s.Fit(ctx, snubber.Network{Kind: snubber.RC, C: 470e-12, R: 10}); err != nil {
		t.Error(err)
	}
}

// BenchmarkTakeHundredReadings is a round of a hundred readings over loopback, in turn with the bare writes and reads of
// the same bytes. It reports, for one reading, the time of both and the overhead: over the bare messages of a reading
// and its error queue, and over the reading's own round trip alone.
func BenchmarkTakeHundredReadings(b *testing.B) {
	b.Run("error queue", func(b *testing.B) { hundredReadings(b, false) })
	b.Run("no error queue", func(b *testing.B) { hundredReadings(b, true) })
}

func hundredReadings(b *testing.B, noQueue bool) {
	const n = 100
	dev := scope()
	dev.Answers["FREQ?"] = "6.2E+7"
	rig := rigOf(acquiretest.Serve(b, dev.Answer))
	rig.Instruments[0].Readings = rig.Instruments[0].Readings[1:]
	rig.Instruments[0].Readings[0].Repeats = n
	rig.Instruments[0].NoErrorQueue = noQueue
	s, err := acquire.Open(context.Background(), rig)
	if err != nil {
		b.Fatal(err)
	}
	defer s.Close()
	conn, err := net.Dial("tcp", strings.TrimPrefix(rig.Instruments[0].Address, "tcp://"))
	if err != nil {
		b.Fatal(err)
	}
	defer conn.Close()
	in := bufio.NewReader(conn)
	bare := func(messages ...string) time.Duration {
		begun := time.Now()
		for range n {
			for _, m := range messages {
				if _, err := io.WriteString(conn, m); err != nil {
					b.Fatal(err)
				}
				if _, err := in.ReadSlice('\n'); err != nil {
					b.Fatal(err)
				}
			}
		}
		return time.Since(begun)
	}
	var ours, both, one time.Duration
	for b.Loop() {
		both += bare("FREQ?\n", "SYSTem:ERRor?\n")
		one += bare("FREQ?\n")
		begun := time.Now()
		if _, err := s.Take(context.Background(), nil); err != nil {
			b.Fatal(err)
		}
		ours += time.Since(begun)
	}
	each := func(d time.Duration) float64 { return d.Seconds() * 1e6 / float64(b.N) / n }
	b.ReportMetric(each(ours), "us/reading")
	b.ReportMetric(each(both), "us/bare-both")
	b.ReportMetric(each(one), "us/bare-one")
	b.ReportMetric(each(ours-both), "us-over-both")
	b.ReportMetric(each(ours-one), "us-over-one")
	b.ReportMetric(ours.Seconds()/both.Seconds(), "of-bare-both")
}
