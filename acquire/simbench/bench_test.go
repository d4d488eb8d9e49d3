package simbench

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"net"
	"strconv"
	"strings"
	"testing"
	"time"
)

// link is a raw client: bytes out, lines in, nothing of the program's own client.
type link struct {
	t testing.TB
	w io.Writer
	r *bufio.Reader
}

func dial(t testing.TB, b *Bench, name string) link {
	t.Helper()
	conn, err := net.Dial("tcp", strings.TrimPrefix(b.Address(name), "tcp://"))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { conn.Close() })
	conn.SetDeadline(time.Now().Add(30 * time.Second))
	return link{t, conn, bufio.NewReader(conn)}
}

func (l link) send(message string) {
	l.t.Helper()
	if _, err := io.WriteString(l.w, message+"\n"); err != nil {
		l.t.Fatal(err)
	}
}

func (l link) ask(message string) string {
	l.t.Helper()
	l.send(message)
	line, err := l.r.ReadString('\n')
	if err != nil {
		l.t.Fatalf("%s: %v", message, err)
	}
	return strings.TrimSuffix(line, "\n")
}

// do sends a command and waits until it is done, so that another instrument sees what it did.
func (l link) do(message string) {
	l.t.Helper()
	if got := l.ask(message + ";*OPC?"); got != "1" {
		l.t.Fatalf("%s: %q", message, got)
	}
}

func (l link) number(message string) float64 {
	l.t.Helper()
	v, err := strconv.ParseFloat(l.ask(message), 64)
	if err != nil {
		l.t.Fatal(err)
	}
	return v
}

func started(t testing.TB) *Bench {
	t.Helper()
	b, err := Start(t.Context(), Default())
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(b.Close)
	return b
}

// TestASeriesOverTCP does by hand what the program's guided series does.
func TestASeriesOverTCP(t *testing.T) {
	b := started(t)
	scope, supply, counter, fixture := dial(t, b, "scope"), dial(t, b, "supply"), dial(t, b, "counter"), dial(t, b, "fixture")
	for name, l := range map[string]link{"SCOPE": scope, "SUPPLY": supply, "COUNTER": counter, "FIXTURE": fixture} {
		if got, want := l.ask("*IDN?"), "RINGBOOK,SIMULATED "+name+",0,1"; got != want {
			t.Errorf("identity %q, want %q", got, want)
		}
	}
	if v := supply.number("MEAS:VOLT?"); math.Abs(v-48) > 0.1 {
		t.Errorf("bus %g V", v)
	}
	if v := counter.number("MEAS:FREQ?"); math.Abs(v-400e3) > 20 || v == 400e3 {
		t.Errorf("switching at %g Hz", v)
	}
	if v := fixture.number("MEAS:CURR?"); math.Abs(v-2.5) > 0.005 {
		t.Errorf("load %g A", v)
	}
	if got := fixture.ask("FIXT:FIT?"); got != "BARE,0.00000000E+00,0.00000000E+00" {
		t.Errorf("at the start %q is fitted", got)
	}
	bare, bareSupply := scope.number("MEAS:FREQ?"), supply.number("MEAS:CURR?")
	if bare < 85e6 || bare > 90e6 {
		t.Errorf("bare ring %g Hz", bare)
	}
	if v := scope.number("MEAS:VOLT:MAX?"); v < 96 || v > 101 {
		t.Errorf("bare peak %g V", v)
	}
	if v := scope.number("MEASure:RING:DECay?"); v < 36e-9 || v > 40e-9 {
		t.Errorf("bare decay %g s", v)
	}
	last := bare
	for _, c := range []string{"1E-10", "220E-12", ".47e-9", "1E-9"} {
		fixture.do("FIXT:FIT C," + c)
		now := scope.number("MEAS:FREQ?")
		if now >= 0.95*last {
			t.Errorf("with %s F the ring is at %g Hz, before it at %g Hz", c, now, last)
		}
		last = now
	}
	fixture.do("FIXT:FIT RC,1E-9,6.8")
	if got := fixture.ask("FIXT:FIT?"); got != "RC,1.00000000E-09,6.80000000E+00" {
		t.Errorf("fitted: %q", got)
	}
	if got := scope.ask("MEAS:FREQ?;RING:DEC?"); got != "9.91E+37;9.91E+37" {
		t.Errorf("well damped, the ring reads %q", got)
	}
	// The snubber draws f Cs E of supply current: 400 kHz of 1 nF at 48 V.
	if d := supply.number("MEAS:CURR?") - bareSupply; math.Abs(d-400e3*1e-9*48) > 1e-3 {
		t.Errorf("the snubber draws %g A", d)
	}
	fixture.do("FIXT:LOAD 0;FIT bare,0,0")
	low := scope.number("MEAS:VOLT:MAX?")
	fixture.do("FIXT:LOAD 4")
	if high := scope.number("MEAS:VOLT:MAX?"); high < low+3 {
		t.Errorf("peak %g V unloaded and %g V at 4 A", low, high)
	}
	supply.do("VOLT 60")
	if v := supply.number("SOUR:VOLT?"); v != 60 {
		t.Errorf("set to %g V", v)
	}
	if got := scope.number("MEAS:VOLT:HIGH?"); math.Abs(got-60) > 0.5 {
		t.Errorf("settled at %g V", got)
	}
	supply.do("OUTP OFF")
	if got := supply.ask("OUTP?;:MEAS:CURR?"); got != "0;0.00000E+00" {
		t.Errorf("off: %q", got)
	}
	if got := scope.ask("MEAS:FREQ?"); got != "9.91E+37" {
		t.Errorf("with the supply off the ring reads %q", got)
	}
	if got := counter.ask("MEAS:FREQ?"); got != "9.91E+37" {
		t.Errorf("with the supply off the counter reads %q", got)
	}
}

// TestOverdriven: a peak outside the converter's range is infinity, not a number cut off.
func TestOverdriven(t *testing.T) {
	b := started(t)
	dial(t, b, "supply").do("VOLT 90")
	if got := dial(t, b, "scope").ask("MEAS:VOLT:MAX?"); got != "9.9E+37" {
		t.Errorf("peak %q", got)
	}
}

// TestWaveform reads a capture as a block and finds in it what the scope said of it.
func TestWaveform(t *testing.T) {
	b := started(t)
	scope := dial(t, b, "scope")
	scope.send("CAPT:DATA?")
	if got := scope.ask("SYST:ERR?"); !strings.HasPrefix(got, "-230,") {
		t.Errorf("with no capture kept: %q", got)
	}
	said := scope.number("MEAS:VOLT:MAX?")
	if again := scope.number("FETCh:VOLT:MAX?"); again != said {
		t.Errorf("the kept capture reads %g V, at first %g V", again, said)
	}
	var points int
	var start, step, bottom, bit float64
	if _, err := fmt.Sscanf(scope.ask("CAPT:PRE?"), "%d,%g,%g,%g,%g", &points, &start, &step, &bottom, &bit); err != nil {
		t.Fatal(err)
	}
	scope.send("CAPT:DATA?")
	head := make([]byte, 6)
	if _, err := io.ReadFull(scope.r, head); err != nil || string(head) != "#42000" || points != 2000 {
		t.Fatalf("block begins %q, preamble says %d points: %v", head, points, err)
	}
	codes := make([]byte, points+1)
	if _, err := io.ReadFull(scope.r, codes); err != nil || codes[points] != '\n' {
		t.Fatalf("block ends %q: %v", codes[points], err)
	}
	high, at := 0.0, 0
	for i, c := range codes[:points] {
		if v := bottom + bit*float64(c); v > high {
			high, at = v, i
		}
	}
	if math.Abs(high-said) > 2 {
		t.Errorf("highest sample %g V, the scope said %g V", high, said)
	}
	if when := start + step*float64(at); math.Abs(when-5e-9) > 1e-9 {
		t.Errorf("peak at %g s", when)
	}
	if v := scope.number("*RST;:CAPT;:FETC:VOLT:HIGH?"); math.Abs(v-48) > 0.2 {
		t.Errorf("settled at %g V", v)
	}
}

// TestRefusals: what cannot be fitted or set is queued with the standard's code and changes nothing.
func TestRefusals(t *testing.T) {
	b := started(t)
	fixture, supply := dial(t, b, "fixture"), dial(t, b, "supply")
	for _, c := range []struct {
		to   link
		send string
		code string
	}{
		{fixture, "FIXT:FIT", "-109"},
		{fixture, "FIXT:FIT LC,1E-9", "-224"},
		{fixture, "FIXT:FIT C", "-224"},
		{fixture, "FIXT:FIT C,-1E-9", "-224"},
		{fixture, "FIXT:FIT C,1E-9,10", "-224"},
		{fixture, "FIXT:FIT C,1", "-224"},
		{fixture, "FIXT:FIT BARE,1E-9", "-224"},
		{fixture, "FIXT:FIT RC,1E-9", "-224"},
		{fixture, "FIXT:FIT RC,1NF,10", "-138"},
		{fixture, "FIXT:FIT RC,1E-9,10,3", "-108"},
		{fixture, "FIXT:FIT 'RC',1E-9,10", "-104"},
		{fixture, "FIXT:LOAD -1", "-222"},
		{supply, "VOLT -5", "-222"},
		{supply, "VOLT 1E6", "-222"},
		{supply, "CURR 5", "-113"},
	} {
		c.to.send(c.send)
		if got := c.to.ask("SYST:ERR?"); !strings.HasPrefix(got, c.code+",") {
			t.Errorf("%q: %s, want %s", c.send, got, c.code)
		}
	}
	if got := fixture.ask("FIXT:FIT?;LOAD?"); got != "BARE,0.00000000E+00,0.00000000E+00;2.50000E+00" {
		t.Errorf("after the refusals: %q", got)
	}
	if got := supply.number("VOLT?"); got != 48 {
		t.Errorf("after the refusals: %g V", got)
	}
}
