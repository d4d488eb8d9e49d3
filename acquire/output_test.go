package acquire_test

import (
	"context"
	"errors"
	"io"
	"math"
	"net"
	"strings"
	"sync"
	"testing"
	"time"

	"ringbook/acquire"
	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
	"ringbook/snubber"
)

// feed is a supply with an output and a bus that falls a little with each reading.
type feed struct {
	acquiretest.Instrument
	mu    sync.Mutex
	on    bool
	stuck bool    // the output does not switch
	volts float64 // V
	falls float64 // what is left of it at the next reading, off
}

func (f *feed) answer(m string) string {
	f.mu.Lock()
	defer f.mu.Unlock()
	switch m {
	case "OUTPut ON", "OUTPut OFF":
		if f.on = m == "OUTPut ON" || f.stuck; f.on {
			f.volts = 48
		}
	case "OUTPut?":
		if f.on {
			return "1\n"
		}
		return "0\n"
	case "VOLT?":
		if !f.on {
			f.volts *= f.falls
		}
		return scpi.Number(f.volts).String() + "\n"
	}
	return f.Instrument.Answer(m)
}

func newFeed(falls float64) *feed {
	return &feed{Instrument: acquiretest.Instrument{
		Identity: "Example Works,Supply 1,0003,1.0", Answers: map[string]string{"*OPC?": "1", "*TST?": "0"},
		Commands: map[string]string{"OUTPut ON": "", "OUTPut OFF": ""},
	}, falls: falls}
}

func feedRig(address string) acquire.Rig {
	return acquire.Rig{Instruments: []acquire.Instrument{{
		Name: "supply", Address: address, Timeout: time.Second,
		Output:   &acquire.BusSwitch{On: []string{"OUTPut ON"}, Off: []string{"OUTPut OFF"}, State: "OUTPut?", Settle: 60 * time.Millisecond},
		Readings: []acquire.Query{{Quantity: snubber.BusV, Query: "VOLT?", Accuracy: acquire.Accuracy{Fixed: 0.1}, Repeats: 1}},
	}}}
}

func TestSwitch(t *testing.T) {
	ctx := context.Background()
	f := newFeed(0)
	s := openStation(t, feedRig(acquiretest.Serve(t, f.answer)))
	if !s.CanSwitch() {
		t.Error("a rig with an output cannot switch")
	}
	begun := time.Now()
	if err := s.Switch(ctx, true); err != nil || time.Since(begun) < 60*time.Millisecond {
		t.Errorf("%v after %s; want the output to settle", err, time.Since(begun))
	}
	if v, err := s.Read(ctx, snubber.BusV); err != nil || v != 48 {
		t.Errorf("%g V, %v", v, err)
	}
	if err := s.Switch(ctx, false); err != nil {
		t.Error(err)
	}
	f.mu.Lock()
	f.on, f.stuck = true, true
	f.mu.Unlock()
	if err := s.Switch(ctx, false); err == nil || !strings.Contains(err.Error(), "switch the bus off: instrument supply") || !strings.Contains(err.Error(), "still on, and should be off") {
		t.Errorf("an output that does not switch: %v", err)
	}
	rig := feedRig(acquiretest.Serve(t, newFeed(0).answer))
	rig.Instruments[0].Output = nil
	s = openStation(t, rig)
	if err := s.Switch(ctx, false); s.CanSwitch() || !errors.Is(err, acquire.ErrNoOutput) {
		t.Errorf("a rig without an output: %v", err)
	}
	refusing := newFeed(0)
	refusing.Commands["OUTPut ON"] = `-221,"Settings conflict;the protection has tripped"`
	s = openStation(t, feedRig(acquiretest.Serve(t, refusing.answer)))
	if err := s.Switch(ctx, true); err == nil || !strings.Contains(err.Error(), `-221 "Settings conflict;the protection has tripped"`) {
		t.Errorf("a refused switch: %v", err)
	}
}

// After a lost link the output is as it was switched, or the work ends; it is never switched for that.
func TestReopenOutput(t *testing.T) {
	ctx := context.Background()
	for name, off := range map[string]bool{"still on": false, "off since": true} {
		f := newFeed(0.5)
		var drops sync.Once
		address, _ := serveLinks(t, func(nth int, rw net.Conn) {
			acquiretest.Talk(rw, func(m string) string {
				dropped := false
				if m == "VOLT?" {
					drops.Do(func() { dropped = true })
				}
				if dropped {
					f.mu.Lock()
					if off {
						f.on = false
					}
					f.mu.Unlock()
					rw.Close()
					return ""
				}
				return f.answer(m)
			})
		})
		s := openStation(t, feedRig(address))
		if err := s.Switch(ctx, true); err != nil {
			t.Fatal(err)
		}
		got, err := s.Take(ctx, nil)
		if !off && (err != nil || got.Readings[0].Value != 48) {
			t.Errorf("%s: %+v, %v", name, got, err)
		}
		if off && (err == nil || !strings.Contains(err.Error(), "its output is off, and should be on")) {
			t.Errorf("%s: %+v, %v", name, got, err)
		}
		if n := strings.Count(strings.Join(f.Heard(), " "), "OUTPut ON"); n != 1 {
			t.Errorf("%s: switched on %d times", name, n)
		}
	}
}

func TestDischarged(t *testing.T) {
	ctx := context.Background()
	f := newFeed(0.5)
	s := openStation(t, feedRig(acquiretest.Serve(t, f.answer)))
	if err := s.Switch(ctx, true); err != nil {
		t.Fatal(err)
	}
	if err := s.Switch(ctx, false); err != nil {
		t.Fatal(err)
	}
	var seen []float64
	if err := s.Discharged(ctx, 5, 10*time.Second, func(v float64) { seen = append(seen, v) }); err != nil {
		t.Fatal(err)
	}
	// By hand: 48 V halved: 24, 12, 6, 3, 1.5: 3 and 1.5 are safe, twice in a row.
	if len(seen) != 5 || seen[4] != 1.5 {
		t.Errorf("%v", seen)
	}
	// With an accuracy of 2.5 V, 3 V may be 5.5: only 1.5 and .75 are safe.
	rig := feedRig(acquiretest.Serve(t, f.answer))
	rig.Instruments[0].Readings[0].Accuracy.Fixed = 2.5
	s = openStation(t, rig)
	s.Switch(ctx, true)
	s.Switch(ctx, false)
	seen = nil
	if err := s.Discharged(ctx, 5, 10*time.Second, func(v float64) { seen = append(seen, v) }); err != nil || len(seen) != 6 {
		t.Errorf("%v, %v", seen, err)
	}
}

func TestNotDischarged(t *testing.T) {
	ctx := context.Background()
	f := newFeed(1)
	s := openStation(t, feedRig(acquiretest.Serve(t, f.answer)))
	s.Switch(ctx, true)
	s.Switch(ctx, false)
	begun := time.Now()
	err := s.Discharged(ctx, 5, 150*time.Millisecond, nil)
	if !errors.Is(err, acquire.ErrStillCharged) || !strings.Contains(err.Error(), "48 V after 150ms, and 5 V is the limit: do not touch the board") || time.Since(begun) > 2*time.Second {
		t.Errorf("%v after %s", err, time.Since(begun))
	}
	for _, limit := range []float64{0, -5, math.NaN(), math.Inf(1)} {
		if err := s.Discharged(ctx, limit, time.Second, nil); err == nil {
			t.Errorf("a limit of %g V was taken", limit)
		}
	}
	cancelled, cancel := context.WithCancel(ctx)
	time.AfterFunc(50*time.Millisecond, cancel)
	if err := s.Discharged(cancelled, 5, time.Minute, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	// No reading is not safe, and neither is a negative bus.
	for reply, want := range map[string]string{"9.91E37": "for all that is known: no reading of bus_v", "-48": "-48 V after"} {
		mute := newFeed(1)
		rig := feedRig(acquiretest.Serve(t, func(m string) string {
			if m == "VOLT?" {
				return reply + "\n"
			}
			return mute.answer(m)
		}))
		if err := openStation(t, rig).Discharged(ctx, 5, 120*time.Millisecond, nil); !errors.Is(err, acquire.ErrStillCharged) || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v", reply, err)
		}
	}
	rig := rigOf(acquiretest.Serve(t, scope().Answer))
	s = openStation(t, rig)
	if err := s.Discharged(ctx, 5, time.Second, nil); !errors.Is(err, acquire.ErrNotProvided) || !strings.Contains(err.Error(), "[instrument.NAME.reading.bus_v]") {
		t.Errorf("a rig that does not read the bus: %v", err)
	}
	if err := rig.Require(snubber.RingHz, snubber.PeakV); err != nil {
		t.Error(err)
	}
	if err := rig.Require(snubber.RingHz, snubber.TempC); !errors.Is(err, acquire.ErrNotProvided) || !strings.Contains(err.Error(), "temp_c") {
		t.Errorf("a reading nobody provides: %v", err)
	}
	gone := func(m string) string {
		if m == "VOLT?" {
			return "hello\n"
		}
		return newFeed(1).answer(m)
	}
	if err := openStation(t, feedRig(acquiretest.Serve(t, gone))).Discharged(ctx, 5, time.Second, nil); err == nil || errors.Is(err, acquire.ErrStillCharged) {
		t.Errorf("a meter that talks nonsense: %v", err)
	}
}

// An address that answers but is no instrument is refused in a sentence that says what answers, and what to do.
func TestNoInstrument(t *testing.T) {
	for name, c := range map[string]struct {
		talk func(rw net.Conn)
		want []string
	}{
		"web server": {func(rw net.Conn) {
			rw.Read(make([]byte, 100))
			io.WriteString(rw, "HTTP/1.1 400 Bad Request\r\nContent-Type: text/plain\r\nConnection: close\r\n\r\n400 Bad Request")
		}, []string{"HTTP/1.1 400 Bad Request", "a web server answers there", "5025"}},
		"login server": {func(rw net.Conn) {
			io.WriteString(rw, "SSH-2.0-Example\r\n")
			io.Copy(io.Discard, rw)
		}, []string{"a login server answers there"}},
		"echo server": {func(rw net.Conn) { io.Copy(rw, rw) }, []string{`reply "*IDN?" to "*IDN?": it only repeats what was sent`, "echo = true", "no instrument answers there"}},
		"silent":      {func(rw net.Conn) { io.Copy(io.Discard, rw) }, []string{`no reply to "*IDN?"`, "check that it is on and cabled, that the address is this instrument's"}},
		"closes":      {func(rw net.Conn) { rw.Read(make([]byte, 1)) }, []string{`at "*IDN?"`, "no other program holds it"}},
		"wrong baud": {func(rw net.Conn) {
			rw.Read(make([]byte, 100))
			io.WriteString(rw, "\xf8\x80\x1e\xe0\n")
			io.Copy(io.Discard, rw)
		}, []string{"not text", "check baud rate, parity and data bits"}},
		"no line end": {func(rw net.Conn) {
			rw.Read(make([]byte, 100))
			io.WriteString(rw, "Example Works,Scope 2,0007,2.1")
			io.Copy(io.Discard, rw)
		}, []string{"half a reply", "have the instrument end its replies with a line feed"}},
		"prompt": {func(rw net.Conn) {
			io.WriteString(rw, "> ")
			acquiretest.Talk(rw, func(m string) string { return scope().Answer(m) + "> " })
		}, []string{`prompt = ">"`}},
		"babbles": {func(rw net.Conn) {
			for err := error(nil); err == nil; {
				_, err = io.WriteString(rw, "1.0\n")
			}
		}, []string{"instrument scope at"}},
	} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			address, _ := serveLinks(t, func(_ int, rw net.Conn) { c.talk(rw) })
			rig := rigOf(address)
			rig.Instruments[0].Timeout = 150 * time.Millisecond
			begun := time.Now()
			_, err := acquire.Open(context.Background(), rig)
			if err == nil {
				t.Fatal("it was opened")
			}
			for _, want := range append(c.want, "open: instrument scope at "+address) {
				if !strings.Contains(err.Error(), want) {
					t.Errorf("%v\nwant it to say %s", err, want)
				}
			}
			if took := time.Since(begun); took > 5*time.Second || strings.Contains(err.Error(), "\n") || len(err.Error()) > 500 {
				t.Errorf("after %s: %v", took, err)
			}
		})
	}
}

// Work that was cancelled in the middle of an exchange leaves nothing that keeps the supply on.
func TestSwitchOffAfterCancel(t *testing.T) {
	f := newFeed(1)
	rig := feedRig(acquiretest.Serve(t, func(m string) string {
		if m == "VOLT?" {
			time.Sleep(200 * time.Millisecond)
		}
		return f.answer(m)
	}))
	s := openStation(t, rig)
	ctx, cancel := context.WithCancel(context.Background())
	if err := s.Switch(ctx, true); err != nil {
		t.Fatal(err)
	}
	time.AfterFunc(50*time.Millisecond, cancel)
	if _, err := s.Take(ctx, nil); !errors.Is(err, context.Canceled) {
		t.Fatal(err)
	}
	if err := s.Switch(context.WithoutCancel(ctx), false); err != nil {
		t.Error(err)
	}
	f.mu.Lock()
	defer f.mu.Unlock()
	if f.on {
		t.Error("the supply is still on")
	}
}
