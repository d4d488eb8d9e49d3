package simbench

import (
	"bufio"
	"errors"
	"io/fs"
	"os"
	"slices"
	"strings"
	"testing"
	"time"

	"go.bug.st/serial"

	"ringbook/acquire/simbench/device"
)

// TestTrouble: each kind comes to the instrument that is named, over the line made for it.
func TestTrouble(t *testing.T) {
	b := started(t)
	trouble, scope, supply := dial(t, b, "trouble"), dial(t, b, "scope"), dial(t, b, "supply")
	scope.ask("*IDN?")
	supply.ask("*IDN?")
	last := func() (line string) {
		t.Helper()
		line, err := scope.r.ReadString('\n')
		if err != nil {
			t.Fatal(err)
		}
		return strings.TrimSuffix(line, "\n")
	}
	trouble.do("TROuble:GARBage SCOPE,2")
	if got := scope.ask("*IDN?"); !strings.HasPrefix(got, "RINGBOOK") {
		t.Errorf("before the garbage %q", got)
	}
	if got := scope.ask("*IDN?") + last(); strings.Contains(got, "RINGBOOK") {
		t.Errorf("the garbage is %q", got)
	}
	trouble.do("TRO:LINE SCOPE,'READY'")
	if got := last(); got != "READY" {
		t.Errorf("unasked %q", got)
	}
	trouble.do("TRO:LINE SCOPE,'AHEAD',1;:TRO:STAL SCOPE")
	if got := scope.ask("*IDN?"); got != "AHEAD" {
		t.Errorf("ahead %q", got)
	}
	if got := scope.ask("*OPC?") + last(); got != "RINGBOOK,SIMULATED SCOPE,0,11" {
		t.Errorf("stale %q", got)
	}
	trouble.do("TRO:DEL SCOPE,0.1")
	if start := time.Now(); scope.ask("*OPC?") != "1" || time.Since(start) < 100*time.Millisecond {
		t.Error("it was not late")
	}
	trouble.do("TRO:CUT SCOPE")
	if got := scope.ask("*IDN?;*IDN?\n*OPC?"); got != "RINGBOOK,SIMULATED SCOPE,0,1;1" {
		t.Errorf("cut %q", got)
	}
	trouble.do("TRO:CUT:BLOC SCOPE")
	if got := scope.ask("CAPT;:CAPT:FORM ASC;*OPC?"); got != "1" {
		t.Errorf("no block %q", got)
	}
	scope.send("CAPT:FORM UINT,8;:CAPT:DATA?")
	scope.send("*IDN?") // 2007 bytes make 1003, then comes this
	rest := make([]byte, 1003)
	for i := range rest {
		c, err := scope.r.ReadByte()
		if err != nil {
			t.Fatal(err)
		}
		rest[i] = c
	}
	if got := last(); string(rest[:6]) != "#42000" || got != "RINGBOOK,SIMULATED SCOPE,0,1" {
		t.Errorf("half a block %q..., then %q", rest[:6], got)
	}
	trouble.do("TRO:ERR SCOPE,-240,'the fan stands still'")
	if got := scope.ask("SYST:ERR?"); got != `-240,"Hardware error;the fan stands still"` {
		t.Errorf("entry %q", got)
	}
	trouble.do("TRO:SIL SCOPE,3600,2")
	scope.ask("*OPC?")
	scope.send("*OPC?")
	for scopeHas := func() bool { _, waiting := b.Troubles("scope"); return waiting > 0 }; scopeHas(); {
		time.Sleep(time.Millisecond)
	}
	trouble.do("TRO:CLE")
	if got := scope.ask("*IDN?"); got != "RINGBOOK,SIMULATED SCOPE,0,1" {
		t.Errorf("after the silence %q", got)
	}
	trouble.do("TRO:DROP SCOPE,1")
	scope.send("*IDN?")
	if got, err := scope.r.ReadString('\n'); err == nil {
		t.Errorf("dropped, it says %q", got)
	}
	if got := dial(t, b, "scope").ask("*OPC?"); got != "1" {
		t.Errorf("dialled again %q", got)
	}
	if got := supply.ask("*IDN?"); got != "RINGBOOK,SIMULATED SUPPLY,0,1" {
		t.Errorf("another instrument suffers: %q", got)
	}
	if got := trouble.ask("TRO:COUN? SCOPE;COUN? SUPPLY"); got != "10,0;0,0" {
		t.Errorf("count %q", got)
	}
	trouble.do("TRO:DROP SUPPLY")
	if got, err := supply.r.ReadString('\n'); err == nil {
		t.Errorf("dropped at once, it says %q", got)
	}
	for send, code := range map[string]string{
		"TRO:DROP": "-109", "TRO:DROP TOASTER": "-224", "TRO:DROP 3": "-104", "TRO:DROP TROUBLE": "-221", "TRO:CUT SCOPE,-1": "-222", "TRO:CUT SCOPE,1.5": "-222",
		"TRO:CUT SCOPE,1E30": "-222", "TRO:SIL SCOPE": "-222", "TRO:SIL SCOPE,1E9": "-222", "TRO:ERR SCOPE,0": "-222", "TRO:LINE SCOPE,HELLO": "-104", "TRO:COUN? X": "-224",
	} {
		trouble.send(send)
		if got := trouble.ask("SYST:ERR?"); !strings.HasPrefix(got, code+",") {
			t.Errorf("%q: %s, want %s", send, got, code)
		}
	}
	if err := b.Trouble("toaster", device.Trouble{Kind: device.Drop}); err == nil {
		t.Error("trouble with a toaster")
	}
	if err := b.Trouble("scope", device.Trouble{Kind: "flood"}); err == nil || !strings.Contains(err.Error(), "the scope") {
		t.Errorf("a flood: %v", err)
	}
}

// TestUnplugged: a drop takes the serial port away, and it comes back at the same path.
func TestUnplugged(t *testing.T) {
	b := started(t)
	path, err := b.ServePTY("supply")
	if err != nil {
		t.Fatal(err)
	}
	open := func() link {
		t.Helper()
		for end := time.Now().Add(10 * time.Second); ; time.Sleep(5 * time.Millisecond) {
			port, err := serial.Open(path, &serial.Mode{})
			if err == nil {
				t.Cleanup(func() { port.Close() })
				return link{t, port, bufio.NewReader(port)}
			}
			if time.Now().After(end) {
				t.Fatal(err)
			}
		}
	}
	l := open()
	l.ask("*IDN?")
	if err := b.Trouble("supply", device.Trouble{Kind: device.Drop, For: 200 * time.Millisecond}); err != nil {
		t.Fatal(err)
	}
	if got, err := l.r.ReadString('\n'); err == nil {
		t.Errorf("unplugged, it says %q", got)
	}
	for b.instruments["supply"].Refuses() { // the path goes at once, or nearly
		if _, err := os.Lstat(path); errors.Is(err, fs.ErrNotExist) {
			break
		}
		time.Sleep(time.Millisecond)
	}
	if !b.instruments["supply"].Refuses() {
		t.Error("the path stayed")
	}
	if got := open().ask("*IDN?"); got != "RINGBOOK,SIMULATED SUPPLY,0,1" {
		t.Errorf("plugged in again %q", got)
	}
	b.Close()
	if _, err := os.Lstat(path); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("after the bench is closed: %v", err)
	}
}

// TestSameSeedSameBench: two benches of one seed say the same, whatever goes wrong with one of them; another seed says
// something else.
func TestSameSeedSameBench(t *testing.T) {
	round := func(seed uint64, spoil bool) (said []string) {
		cfg := Default()
		cfg.Seed = seed
		b, _, ask := stopped(t, cfg)
		if spoil {
			b.Trouble("scope", device.Trouble{Kind: device.Entry, Code: -300})
			b.instruments["scope"].Execute([]byte("*CLS"))
		}
		for _, c := range []string{"(@1)", "(@20,30)"} {
			ask("relays", "ROUT:OPEN:ALL;:ROUT:CLOS "+c)
			for name, message := range map[string]string{
				"scope": "MEAS:FREQ?;RING:DEC?;:MEAS:VOLT:MAX?", "supply": "MEAS:VOLT?;CURR?", "thermometer": "MEAS:TEMP?",
			} {
				said = append(said, name+ask(name, message))
			}
		}
		slices.Sort(said)
		return said
	}
	first := round(7, false)
	if again := round(7, true); !slices.Equal(first, again) {
		t.Errorf("one seed says\n%v\nand\n%v", first, again)
	}
	other := round(8, false)
	for i := range first {
		if slices.Contains(other, first[i]) {
			t.Errorf("two seeds say %q", first[i])
		}
	}
}
