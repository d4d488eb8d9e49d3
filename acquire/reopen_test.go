package acquire_test

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"runtime"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"ringbook/acquire"
	"ringbook/acquire/acquiretest"
	"ringbook/acquire/scpi"
	"ringbook/snubber"
)

// serveLinks serves every link by itself: nth counts them from 0. A link ends when talk returns.
func serveLinks(t *testing.T, talk func(nth int, rw net.Conn)) (address string, close func()) {
	t.Helper()
	listener, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	var all sync.WaitGroup
	ctx, cancel := context.WithCancel(context.Background())
	all.Go(func() {
		for nth := 0; ; nth++ {
			conn, err := listener.Accept()
			if err != nil {
				return
			}
			stop := context.AfterFunc(ctx, func() { conn.Close() })
			all.Go(func() {
				defer stop()
				defer conn.Close()
				talk(nth, conn)
			})
		}
	})
	close = func() { listener.Close(); cancel(); all.Wait() }
	t.Cleanup(close)
	return "tcp://" + listener.Addr().String(), close
}

// until answers until the nth FREQ?, from 1, at which fault does what it likes; false: the link is dropped.
func until(rw net.Conn, answer func(string) string, nth int, fault func() bool) {
	in := bufio.NewScanner(rw)
	for n := 0; in.Scan(); {
		m := strings.TrimSpace(in.Text())
		if m == "" {
			continue
		}
		if m == "FREQ?" {
			if n++; n == nth && !fault() {
				return
			}
		}
		io.WriteString(rw, answer(m))
	}
}

func drop() bool { return false }

// A link that is dropped in the middle of a round is opened again; the setup, and the network that was fitted, are sent
// again, and the round is begun again from its start: no repeat of before counts.
func TestReopen(t *testing.T) {
	ctx := context.Background()
	dev := scope()
	dev.Answers["FREQ?"] = "6.2E+7"
	dev.Sequence["FREQ?"] = []string{"9.9E+6", "9.9E+6"} // before the fault
	address, _ := serveLinks(t, func(nth int, rw net.Conn) {
		at := 0 // never
		if nth == 0 {
			at = 3
		}
		until(rw, dev.Answer, at, drop)
	})
	s := openStation(t, rigOf(address))
	var told []string
	s.Notify(func(m string) { told = append(told, m) })
	if err := s.Fit(ctx, snubber.Network{Kind: snubber.RC, C: 470e-12, R: 10}); err != nil {
		t.Fatal(err)
	}
	var repeats []int
	got, err := s.Take(ctx, func(p acquire.Progress) { repeats = append(repeats, p.Repeat) })
	if err != nil {
		t.Fatal(err)
	}
	ring := got.Readings[0]
	if ring.Value != 6.2e7 || len(ring.Repeats) != 4 {
		t.Errorf("%+v: a repeat of before the fault was kept", ring)
	}
	if want := "[1 2 1 2 3 4 1]"; fmt.Sprint(repeats) != want {
		t.Errorf("progress %v; want %s", repeats, want)
	}
	if len(got.Warnings) == 0 || !strings.Contains(got.Warnings[0], "the instrument closed the link at \"FREQ?\"") || !strings.Contains(got.Warnings[0], "begun again from its start") {
		t.Errorf("warnings %q", got.Warnings)
	}
	if len(told) != 3 || !strings.Contains(told[0], "opened again, for 30s at most") || !strings.Contains(told[1], "its link is open again after") {
		t.Errorf("told %q", told)
	}
	heard := strings.Join(dev.Heard(), " ")
	if want := "MODE RING FIT rc,4.7E-10,1.0E+01 FREQ? FREQ? MODE RING FIT rc,4.7E-10,1.0E+01 FREQ? FREQ? FREQ? FREQ? VMAX?"; heard != want {
		t.Errorf("heard %s\nwant  %s", heard, want)
	}
	// The next round is an ordinary one.
	if got, err := s.Take(ctx, nil); err != nil || len(got.Warnings) > 1 {
		t.Errorf("%+v, %v", got.Warnings, err)
	}
}

// What a link serves of before the fault, on the old link or on the new, is never taken.
func TestStaleReplies(t *testing.T) {
	ctx := context.Background()
	for name, talk := range map[string]func(dev *acquiretest.Instrument) func(nth int, rw net.Conn){
		// A reply that comes after the timeout: the instrument answers again, so the round is begun again.
		"late": func(dev *acquiretest.Instrument) func(int, net.Conn) {
			return func(_ int, rw net.Conn) {
				until(rw, dev.Answer, 2, func() bool {
					time.Sleep(250 * time.Millisecond)
					io.WriteString(rw, "9.9E+06\n")
					return true
				})
			}
		},
		// A converter between network and serial line that keeps what nobody took for whoever comes next.
		"kept by a converter": func(dev *acquiretest.Instrument) func(int, net.Conn) {
			return func(nth int, rw net.Conn) {
				if nth == 0 {
					until(rw, dev.Answer, 2, drop)
					return
				}
				io.WriteString(rw, "9.9E+06\n0,\"No error\"\n")
				time.AfterFunc(20*time.Millisecond, func() { io.WriteString(rw, "9.9E+06\n") })
				until(rw, dev.Answer, 0, nil)
			}
		},
		"garbage": func(dev *acquiretest.Instrument) func(int, net.Conn) {
			var once sync.Once
			return func(_ int, rw net.Conn) {
				acquiretest.Talk(rw, func(m string) (reply string) {
					reply = dev.Answer(m)
					if m == "FREQ?" {
						once.Do(func() { reply = "\xf8\x80\n" })
					}
					return reply
				})
			}
		},
		"an unsolicited line": func(dev *acquiretest.Instrument) func(int, net.Conn) {
			var once sync.Once
			return func(_ int, rw net.Conn) {
				acquiretest.Talk(rw, func(m string) (reply string) {
					reply = dev.Answer(m)
					if m == "FREQ?" {
						once.Do(func() { io.WriteString(rw, "9.9E+06\n"); time.Sleep(20 * time.Millisecond) })
					}
					return reply
				})
			}
		},
		"half of it": func(dev *acquiretest.Instrument) func(int, net.Conn) {
			return func(nth int, rw net.Conn) {
				if nth == 0 {
					until(rw, dev.Answer, 2, func() bool { io.WriteString(rw, "9.9E"); return false })
					return
				}
				io.WriteString(rw, "+06\n")
				until(rw, dev.Answer, 0, nil)
			}
		},
	} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			dev := scope()
			dev.Sequence, dev.Answers["FREQ?"] = nil, "6.2E+7"
			address, _ := serveLinks(t, talk(dev))
			rig := rigOf(address)
			rig.Instruments[0].Timeout = 200 * time.Millisecond
			s := openStation(t, rig)
			got, err := s.Take(ctx, nil)
			if err != nil || len(got.Readings) != 2 {
				t.Fatalf("%+v, %v", got, err)
			}
			for _, v := range got.Readings[0].Repeats {
				if v != 6.2e7 {
					t.Errorf("a reply from before was taken: %v", got.Readings[0].Repeats)
				}
			}
			if len(got.Warnings) == 0 || !strings.Contains(got.Warnings[0], "begun again") {
				t.Errorf("warnings %q", got.Warnings)
			}
		})
	}
}

// An instrument that is silent for good is asked again once, and no more.
func TestSilentTwice(t *testing.T) {
	dev := scope()
	var asked atomic.Int32
	rig := rigOf(acquiretest.Serve(t, func(m string) string {
		if m == "FREQ?" {
			asked.Add(1)
			time.Sleep(150 * time.Millisecond)
			return ""
		}
		return dev.Answer(m)
	}))
	rig.Instruments[0].Timeout = 50 * time.Millisecond
	_, err := openStation(t, rig).Take(context.Background(), nil)
	var link *scpi.LinkError
	if !errors.As(err, &link) || !link.Timeout() || asked.Load() != 2 {
		t.Errorf("asked %d times: %v", asked.Load(), err)
	}
}

// Another instrument behind the address is an error at once, and nothing is read of it.
func TestReopenToAnother(t *testing.T) {
	other := scope()
	other.Identity = "Other Works,Scope 3,0008,1.0"
	address, _ := serveLinks(t, func(nth int, rw net.Conn) {
		if nth == 0 {
			until(rw, scope().Answer, 2, drop)
			return
		}
		until(rw, other.Answer, 0, nil)
	})
	rig := rigOf(address)
	rig.Instruments[0].Timeout = 100 * time.Millisecond
	begun := time.Now()
	got, err := openStation(t, rig).Take(context.Background(), nil)
	if !errors.Is(err, scpi.ErrOtherInstrument) || !strings.Contains(err.Error(), "Other Works") || got.Readings != nil || time.Since(begun) > 5*time.Second {
		t.Errorf("%+v, %v after %s", got, err, time.Since(begun))
	}
	if h := other.Heard(); len(h) != 0 {
		t.Errorf("the other one was told %q", h)
	}
}

// A link that does not come back is given up after the time stated, and the station can be tried again after that.
func TestReopenInVain(t *testing.T) {
	address, end := serveLinks(t, func(nth int, rw net.Conn) { until(rw, scope().Answer, 2, drop) })
	rig := rigOf(address)
	rig.Instruments[0].Reopen = 400 * time.Millisecond
	s, err := acquire.Open(context.Background(), rig)
	if err != nil {
		t.Fatal(err)
	}
	s.Notify(func(string) { end() })
	before := runtime.NumGoroutine()
	begun := time.Now()
	_, err = s.Take(context.Background(), nil)
	took := time.Since(begun)
	var lost *acquire.LostError
	if !errors.As(err, &lost) || took < 300*time.Millisecond || took > 3*time.Second {
		t.Errorf("%v after %s", err, took)
	}
	for _, want := range []string{"read ring_hz: instrument scope at " + address, "the instrument closed the link", "opened again for 400ms in vain", "connection refused", "check its power and its cable"} {
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%v\nwant it to say %s", err, want)
		}
	}
	cancelled, cancel := context.WithCancel(context.Background())
	time.AfterFunc(50*time.Millisecond, cancel)
	if _, err := s.Take(cancelled, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled while it is opened again: %v", err)
	}
	if err := s.Close(); err != nil {
		t.Errorf("Close: %v", err)
	}
	if left := runtime.NumGoroutine(); left > before {
		t.Errorf("%d goroutines, before %d", left, before)
	}
	rig.Instruments[0].Reopen = -1
	address, _ = serveLinks(t, func(nth int, rw net.Conn) { until(rw, scope().Answer, 2, drop) })
	rig.Instruments[0].Address = address
	if _, err := openStation(t, rig).Take(context.Background(), nil); err == nil || errors.As(err, &lost) {
		t.Errorf("with reopen at nothing: %v", err)
	}
}

// A link that is dropped again and again ends the work at last.
func TestReopenFlapping(t *testing.T) {
	address, _ := serveLinks(t, func(_ int, rw net.Conn) { until(rw, scope().Answer, 1, drop) })
	_, err := openStation(t, rigOf(address)).Take(context.Background(), nil)
	var link *scpi.LinkError
	if !errors.As(err, &link) || !errors.Is(err, io.EOF) {
		t.Error(err)
	}
}

// A capture that the fault cut in two is made anew from the first.
func TestReopenCapture(t *testing.T) {
	dev := waveScope(4, "#14abcd")
	address, _ := serveLinks(t, func(nth int, rw net.Conn) {
		in, n := bufio.NewScanner(rw), 0
		for in.Scan() {
			m := strings.TrimSpace(in.Text())
			if m == "DATA?" && nth == 0 {
				if n++; n == 2 {
					io.WriteString(rw, "#14ab")
					return
				}
			}
			if m != "" {
				io.WriteString(rw, dev.Answer(m))
			}
		}
	})
	s := openStation(t, wave(address, acquire.Uint8, ""))
	got, err := s.Capture(context.Background(), 3)
	if err != nil || len(got) != 3 {
		t.Fatalf("%v, %v", got, err)
	}
	for _, r := range got {
		if len(r.Volts) != 4 || r.Volts[0] != (3+('a'-1)*0.25)*10 {
			t.Errorf("%+v", r)
		}
	}
	if n := strings.Count(strings.Join(dev.Heard(), " "), "ARM"); n != 2+3 {
		t.Errorf("%d captures were made; want 2 before the fault and 3 behind it", n)
	}
}
