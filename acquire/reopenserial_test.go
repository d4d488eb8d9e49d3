//go:build linux || darwin

package acquire_test

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/creack/pty"

	"ringbook/acquire"
	"ringbook/acquire/acquiretest"
	"ringbook/acquire/wire"
)

// An adapter that is unplugged and plugged in again: its terminal is gone, and another comes in its place.
func TestReopenSerial(t *testing.T) {
	device := filepath.Join(t.TempDir(), "ttyUSB0")
	dev := scope()
	dev.Sequence, dev.Answers["FREQ?"] = nil, "6.2E+7"
	plug := func() *os.File {
		master, slave, err := pty.Open()
		if err != nil {
			t.Fatal(err)
		}
		slave.Close()
		os.Remove(device)
		if err := os.Symlink(slave.Name(), device); err != nil {
			t.Fatal(err)
		}
		return master
	}
	first := plug()
	var mu sync.Mutex
	reads, unplugged := 0, false
	var second *os.File
	answer := func(m string) string {
		mu.Lock()
		defer mu.Unlock()
		if m == "FREQ?" {
			if reads++; reads == 3 && !unplugged {
				unplugged = true
				first.Close()
				os.Remove(device)
				time.AfterFunc(300*time.Millisecond, func() {
					master := plug()
					mu.Lock()
					second = master
					mu.Unlock()
					time.Sleep(100 * time.Millisecond) // until the other end has set the line raw
				})
				return ""
			}
		}
		return dev.Answer(m)
	}
	open := func(ctx context.Context, address string) (wire.Link, error) {
		link, err := wire.Open(ctx, address)
		if err != nil {
			return nil, err
		}
		mu.Lock()
		end := second
		mu.Unlock()
		if end == nil {
			end = first
		}
		go acquiretest.Talk(end, answer)
		return link, nil
	}
	rig := rigOf("serial://" + device)
	s, err := acquire.OpenWith(context.Background(), rig, open)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	defer func() {
		if second != nil {
			second.Close()
		}
	}()
	got, err := s.Take(context.Background(), nil)
	if err != nil || len(got.Readings) != 2 || got.Readings[0].Value != 6.2e7 || len(got.Readings[0].Repeats) != 4 {
		t.Fatalf("%+v, %v", got, err)
	}
	if len(got.Warnings) == 0 || !strings.Contains(got.Warnings[0], "begun again") {
		t.Errorf("%q", got.Warnings)
	}
}
