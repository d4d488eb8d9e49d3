package simbench

import (
	"math"
	"strconv"
	"strings"
	"testing"
	"time"
)

// stopped is a bench whose clock stands still until the test moves it, and ask, which speaks to an instrument without
// a link between.
func stopped(t *testing.T, cfg Config) (b *Bench, pass func(time.Duration), ask func(name, message string) string) {
	t.Helper()
	b, err := Start(t.Context(), cfg)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(b.Close)
	now := time.Duration(0)
	b.clock = func() time.Duration { return now }
	ask = func(name, message string) string {
		t.Helper()
		got := strings.TrimSuffix(string(b.instruments[name].Execute([]byte(message))), "\n")
		if e := string(b.instruments[name].Execute([]byte("SYST:ERR?"))); e != "0,\"No error\"\n" {
			t.Fatalf("%s, %q: %s", name, message, e)
		}
		return got
	}
	return b, func(d time.Duration) { now += d }, ask
}

func numberIn(t *testing.T, text string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// TestBus: off, the bus falls with its time constant; on, it rises evenly; and what rings, draws and counts stands
// still while the output is off.
func TestBus(t *testing.T) {
	cfg := Default()
	cfg.Bus = Bus{RiseS: 0.2, DischargeS: 2, SafeV: 5, Speed: 1}
	b, pass, ask := stopped(t, cfg)
	bus := func(want float64) {
		t.Helper()
		if v := numberIn(t, ask("supply", "MEAS:VOLT?")); math.Abs(v-want) > 0.002*want+1e-9 {
			t.Errorf("bus at %g V, want %g V", v, want)
		}
	}
	bus(48)
	ask("supply", "OUTP OFF")
	bus(48)
	if got := ask("supply", "OUTP?;:MEAS:CURR?"); got != "0;0.00000E+00" {
		t.Errorf("off: %q", got)
	}
	if got := ask("scope", "MEAS:FREQ?;RING:DEC?"); got != "9.91E+37;9.91E+37" {
		t.Errorf("off, the ring reads %q", got)
	}
	if v := numberIn(t, ask("scope", "MEAS:VOLT:HIGH?")); math.Abs(v-48) > 0.5 {
		t.Errorf("off, the node stands at %g V", v)
	}
	pass(2 * time.Second)
	bus(48 / math.E)
	ask("supply", "OUTP OFF") // it is off already: nothing begins anew
	pass(2 * time.Second)
	bus(48 / math.E / math.E)
	from := b.busV()
	ask("supply", "OUTP ON;:OUTP ON")
	pass(50 * time.Millisecond)
	ask("supply", "OUTP ON")
	pass(50 * time.Millisecond)
	bus(from + 24)
	rising := numberIn(t, ask("scope", "MEAS:VOLT:MAX?"))
	pass(100 * time.Millisecond)
	bus(48)
	if full := numberIn(t, ask("scope", "MEAS:VOLT:MAX?")); full < rising+10 {
		t.Errorf("peak %g V on the rising bus, %g V on the full one", rising, full)
	}
	ask("supply", "VOLT 60")
	bus(60)
	ask("supply", "*RST")
	pass(4 * time.Second)
	bus(60 / math.E / math.E)
	ask("supply", "VOLT 5;:OUTP ON") // what is above is taken down
	bus(5)

	cfg.Bus.RiseS, cfg.Bus.DischargeS = 0, 0
	_, _, ask = stopped(t, cfg)
	if v := numberIn(t, ask("supply", "OUTP OFF;:MEAS:VOLT?")); v != 0 {
		t.Errorf("with nothing to discharge, %g V", v)
	}
	ask("supply", "OUTP ON")
	bus(48)
}

// TestSpeed: the bench's time runs as fast as it is told to.
func TestSpeed(t *testing.T) {
	cfg := Default()
	cfg.Bus.DischargeS, cfg.Bus.Speed = 100, 1e4
	b, err := Start(t.Context(), cfg)
	if err != nil {
		t.Fatal(err)
	}
	defer b.Close()
	supply := dial(t, b, "supply")
	supply.do("OUTP OFF")
	time.Sleep(100 * time.Millisecond) // a thousand seconds
	if v := supply.number("MEAS:VOLT?"); v > 0.01 || v == 0 {
		t.Errorf("bus at %g V after ten time constants", v)
	}
}

// TestMistakes: parts that are changed on a live bus are noticed, those on a dead one are not.
func TestMistakes(t *testing.T) {
	b, pass, ask := stopped(t, Default())
	count := func(want int, highest float64) {
		t.Helper()
		got := strings.Split(ask("fixture", "FIXT:MIST?"), ",")
		if got[0] != strconv.Itoa(want) || len(b.Mistakes()) != want || math.Abs(numberIn(t, got[1])-highest) > 0.01 {
			t.Errorf("mistakes %v and %v, want %d, up to %g V", got, b.Mistakes(), want, highest)
		}
	}
	change := map[string]func(){
		"fit":   func() { ask("fixture", "FIXT:FIT C,1E-9"); ask("fixture", "*RST") },
		"relay": func() { ask("relays", "ROUT:CLOS (@1:3)"); ask("relays", "ROUT:OPEN:ALL") },
		"none": func() {
			ask("fixture", "FIXT:FIT BARE")
			ask("fixture", "*RST;:FIXT:LOAD 2")
			ask("relays", "ROUT:OPEN (@1:50);OPEN:ALL;*RST")
		},
	}
	change["none"]()
	count(0, 0)
	change["fit"]()
	count(2, 48)
	change["relay"]()
	count(4, 48)
	ask("supply", "OUTP OFF")
	pass(time.Second) // two time constants: 6.5 V
	change["fit"]()
	count(6, 48)
	if m := b.Mistakes()[5]; math.Abs(m.BusV-48*math.Exp(-2)) > 1e-9 || m.At != time.Second {
		t.Errorf("the last one is %+v", m)
	}
	pass(time.Duration((math.Log(48/5.0049) - 2) / 2 * float64(time.Second))) // safe, says a meter that is 0.1 % wrong
	for name := range change {
		change[name]()
	}
	count(6, 48)
	ask("supply", "OUTP ON")
	pass(200 * time.Millisecond)
	change["relay"]()
	count(8, 48)
}

// TestRelays: the card says what it has closed, and the board rings with the capacitors that are.
func TestRelays(t *testing.T) {
	cfg := Default()
	cfg.Scope.NoiseV, cfg.Parts.ESR = 0, 0
	b, _, ask := stopped(t, cfg)
	if list := b.Relays(); len(list) != 50 || list[0] != 22e-12 || list[24] != 220e-12 || list[49] != 2.4e-9 {
		t.Errorf("the card holds %v", list)
	}
	if got := ask("relays", "ROUT:CLOS:STAT?;:REL:CAP? (@1,50)"); got != "(@);2.20000E-11,2.40000E-09" {
		t.Errorf("at the start %q", got)
	}
	if got := ask("relays", "ROUT:CLOS (@2,4:6);CLOS? (@1:4);OPEN? (@1:4);:ROUT:CLOS:STAT?"); got != "0,1,0,1;1,0,1,0;(@2,4,5,6)" {
		t.Errorf("closed %q", got)
	}
	if got := ask("relays", "ROUT:OPEN (@4:50);CLOS:STAT?"); got != "(@2)" {
		t.Errorf("left closed %q", got)
	}
	ask("relays", "*RST")
	ring := func() float64 { return numberIn(t, ask("scope", "MEAS:FREQ?")) }
	bare := ring()
	peak := map[string]float64{}
	for i := range 50 {
		c := b.Relays()[i]
		ask("relays", "ROUT:CLOS (@"+strconv.Itoa(i+1)+")")
		switched := ring()
		if i == 20 {
			peak["switched"] = numberIn(t, ask("scope", "MEAS:VOLT:MAX?"))
		}
		ask("relays", "ROUT:OPEN:ALL")
		ask("fixture", "FIXT:FIT C,"+strconv.FormatFloat(c, 'E', -1, 64))
		soldered := ring()
		if i == 20 {
			peak["soldered"] = numberIn(t, ask("scope", "MEAS:VOLT:MAX?"))
		}
		ask("fixture", "FIXT:FIT BARE")
		if math.Abs(switched-soldered) > 2e-3*soldered || switched > bare {
			t.Errorf("%g F rings at %g Hz soldered, %g Hz switched, %g Hz without", c, soldered, switched, bare)
		}
	}
	if math.Abs(peak["switched"]-peak["soldered"]) > 0.7 {
		t.Errorf("peaks %v", peak)
	}
	// Two are their sum, and they come besides what is soldered.
	if math.Abs(ring()-bare) > 1e-3*bare {
		t.Error("something is left")
	}
	for _, c := range []string{"C,1E-9", "RC,1E-9,20"} {
		ask("fixture", "FIXT:FIT "+c)
		one := numberIn(t, ask("scope", "MEAS:VOLT:MAX?"))
		ask("relays", "ROUT:CLOS (@49:50)")
		if two := numberIn(t, ask("scope", "MEAS:VOLT:MAX?")); math.Abs(two-one) < 1 {
			t.Errorf("%s: peak %g V, with relays closed %g V", c, one, two)
		}
		ask("relays", "*RST")
	}
	ask("fixture", "*RST")
	ask("relays", "ROUT:CLOS (@10,20)")
	want := Network{Kind: C, C: b.model.cfg.Parts.actual(Network{Kind: C, C: b.Relays()[9]}).C + b.model.cfg.Parts.actual(Network{Kind: C, C: b.Relays()[19]}).C}
	if got := b.acrossF(); got != want.C {
		t.Errorf("two in parallel are %g F, want %g F", got, want.C)
	}

	// A slow ring is followed as long as that of the same capacitor soldered in.
	cfg.Relays = []float64{1e-6}
	slow, _, askSlow := stopped(t, cfg)
	askSlow("relays", "ROUT:CLOS (@1)")
	switched, err := slow.now()
	if err != nil {
		t.Fatal(err)
	}
	askSlow("relays", "*RST")
	askSlow("fixture", "FIXT:FIT C,1E-6")
	if soldered, err := slow.now(); err != nil || soldered.end != switched.end || math.Abs(soldered.charge-switched.charge) > 1e-3*soldered.charge {
		t.Errorf("%v to %g s, %g C; switched to %g s, %g C", err, soldered.end, soldered.charge, switched.end, switched.charge)
	}

	relays := dial(t, b, "relays")
	for send, code := range map[string]string{
		"ROUT:CLOS (@51)": "-222", "ROUT:CLOS (@1,51)": "-222", "ROUT:CLOS 1": "-104", "ROUT:CLOS": "-109", "ROUT:OPEN (@0)": "-222", "REL:CAP? (@99)": "-222",
	} {
		relays.send(send)
		if got := relays.ask("SYST:ERR?"); !strings.HasPrefix(got, code+",") {
			t.Errorf("%q: %s, want %s", send, got, code)
		}
	}
	if got := ask("relays", "ROUT:CLOS:STAT?"); got != "(@10,20)" {
		t.Errorf("after the refusals %q", got)
	}
}

// TestThermometer: ambient while off, and above it what the network takes from the bus in every cycle.
func TestThermometer(t *testing.T) {
	b, _, ask := stopped(t, Default())
	read := func(want float64) {
		t.Helper()
		if c := numberIn(t, ask("thermometer", "MEAS:TEMP?")); math.Abs(c-want) > 0.6 {
			t.Errorf("%g degrees, want %g", c, want)
		}
	}
	// The board's own charge at 48 V: FixedC E + JunctionC JunctionV 2 (sqrt(1+E/JunctionV) - 1), by hand; the probe's besides.
	own := 180e-12*48 + 150e-12*9*2*(math.Sqrt(1+48/9.)-1) + 3.9e-12*48
	read(23 + 30*400e3*48*own)
	ask("fixture", "FIXT:FIT RC,1E-9,6.8")
	part := b.model.cfg.Parts.actual(Network{Kind: RC, C: 1e-9, R: 6.8}).C
	read(23 + 30*400e3*48*(own+part*48))
	ask("supply", "OUTP OFF")
	read(23)
}
