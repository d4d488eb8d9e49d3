package simbench

import (
	"bufio"
	"context"
	"fmt"
	"io"
	"math"
	"net"
	"os"
	"runtime"
	"strings"
	"sync"
	"testing"
	"time"

	"go.bug.st/serial"
)

// TestPseudoTerminal speaks to an instrument as through a serial port: with go.bug.st/serial, and as a
// program does that opens the path and sets nothing.
func TestPseudoTerminal(t *testing.T) {
	b := started(t)
	path, err := b.ServePTY("supply")
	if err != nil {
		t.Fatal(err)
	}
	for range 2 { // a client may come, go, and come again
		port, err := serial.Open(path, &serial.Mode{BaudRate: 9600})
		if err != nil {
			t.Fatal(err)
		}
		if err := port.SetReadTimeout(10 * time.Second); err != nil {
			t.Fatal(err)
		}
		l := link{t, port, bufio.NewReader(port)}
		if got := l.ask("*IDN?\r"); got != "RINGBOOK,SIMULATED SUPPLY,0,1" {
			t.Errorf("identity %q", got)
		}
		if v := l.number("MEAS:VOLT?"); math.Abs(v-48) > 0.1 {
			t.Errorf("bus %g V", v)
		}
		if err := port.Close(); err != nil {
			t.Fatal(err)
		}
	}
	if path, err = b.ServePTY("scope"); err != nil {
		t.Fatal(err)
	}
	plain, err := os.OpenFile(path, os.O_RDWR, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer plain.Close()
	l := link{t, plain, bufio.NewReader(plain)}
	if v := l.number("MEAS:FREQ?"); v < 80e6 {
		t.Errorf("ring %g Hz", v)
	}
	l.send("CAPT:DATA?") // bytes of every value pass, line ends among them
	block := make([]byte, 6+2000+1)
	if _, err := io.ReadFull(l.r, block); err != nil || string(block[:6]) != "#42000" || block[2006] != '\n' {
		t.Errorf("block %q...: %v", block[:6], err)
	}
	if _, err := b.ServePTY("toaster"); err == nil {
		t.Error("an instrument that is none was served")
	}
}

// TestCloseLetsEverybodyGo: after Close, or when the context ends, no goroutine is left, clients that sit idle
// or do not read their replies included.
func TestCloseLetsEverybodyGo(t *testing.T) {
	for _, how := range []string{"close", "context"} {
		before := runtime.NumGoroutine()
		ctx, cancel := context.WithCancel(t.Context())
		b, err := Start(ctx, Default())
		if err != nil {
			t.Fatal(err)
		}
		path, err := b.ServePTY("scope")
		if err != nil {
			t.Fatal(err)
		}
		tty, err := os.OpenFile(path, os.O_RDWR, 0)
		if err != nil {
			t.Fatal(err)
		}
		idle := dial(t, b, "supply")
		idle.ask("*IDN?")
		deaf := dial(t, b, "scope")
		deaf.ask("MEAS:FREQ?")
		stuffed := make(chan struct{})
		go func() { // fill the sockets' buffers and the terminal's until writing fails
			defer close(stuffed)
			for {
				if _, err := io.WriteString(deaf.w, "CAPT:DATA?\n"); err != nil {
					return
				}
			}
		}()
		io.WriteString(tty, strings.Repeat("CAPT:DATA?\n", 20))
		time.Sleep(50 * time.Millisecond)
		start := time.Now()
		if how == "context" {
			cancel()
			b.serves.Wait()
		}
		b.Close()
		b.Close()
		cancel()
		<-stuffed
		if d := time.Since(start); d > 5*time.Second {
			t.Errorf("%s: it took %v", how, d)
		}
		tty.Close()
		left := runtime.NumGoroutine()
		for end := time.Now().Add(5 * time.Second); left > before && time.Now().Before(end); left = runtime.NumGoroutine() {
			time.Sleep(10 * time.Millisecond)
		}
		if left > before {
			buf := make([]byte, 1<<16)
			t.Errorf("%s: %d goroutines, before %d\n%s", how, left, before, buf[:runtime.Stack(buf, true)])
		}
		if _, err := b.ServePTY("scope"); err == nil {
			t.Errorf("%s: a closed bench serves", how)
		}
	}
}

// TestManyClients lets several clients change and read the bench at once; the race detector watches.
func TestManyClients(t *testing.T) {
	b := started(t)
	var all sync.WaitGroup
	for i := range 4 {
		scope, fixture, supply := dial(t, b, "scope"), dial(t, b, "fixture"), dial(t, b, "supply")
		all.Go(func() {
			for k := range 10 {
				fmt.Fprintf(fixture.w, "FIXT:FIT RC,%dE-10,10\n", 1+(i+k)%3)
				fmt.Fprint(scope.w, "MEAS:VOLT:MAX?\n")
				fmt.Fprint(supply.w, "VOLT 48;:MEAS:CURR?\n")
				for _, l := range []link{scope, supply} {
					if line, err := l.r.ReadString('\n'); err != nil {
						t.Errorf("%q: %v", line, err)
					}
				}
			}
		})
	}
	all.Wait()
}

func TestStartRefuses(t *testing.T) {
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer ln.Close()
	cfg := Default()
	cfg.Ports = map[string]int{"counter": ln.Addr().(*net.TCPAddr).Port}
	if _, err := Start(t.Context(), cfg); err == nil || !strings.Contains(err.Error(), "the counter cannot listen") {
		t.Errorf("a port in use: %v", err)
	}
	for name, spoil := range map[string]func(*Config){
		"board inductance":    func(c *Config) { c.Board.Inductance = 0 },
		"board capacitance":   func(c *Config) { c.Board.FixedC, c.Board.JunctionC = 0, 0 },
		"grading":             func(c *Config) { c.Board.Grading = 1 },
		"body diode":          func(c *Config) { c.Board.BodyOhm = -1 },
		"duty":                func(c *Config) { c.Board.Duty = 2 },
		"tolerances":          func(c *Config) { c.Parts.CTol = 1 },
		"series resistance":   func(c *Config) { c.Parts.ESR = -1 },
		"network diode":       func(c *Config) { c.Parts.DiodeOhm = 0 },
		"bus voltage":         func(c *Config) { c.BusV = math.NaN() },
		"load current":        func(c *Config) { c.LoadA = -1 },
		"switching frequency": func(c *Config) { c.SwitchingHz = 0 },
		"probe":               func(c *Config) { c.ProbeF = math.Inf(1) },
		"points":              func(c *Config) { c.Scope.Points = 10 },
		"noise":               func(c *Config) { c.Scope.NoiseV = -1 },
		"toaster":             func(c *Config) { c.Ports = map[string]int{"toaster": 1} },
		"port 70000":          func(c *Config) { c.Ports = map[string]int{"scope": 70000} },
	} {
		cfg := Default()
		spoil(&cfg)
		if _, err := Start(t.Context(), cfg); err == nil || !strings.Contains(err.Error(), name) {
			t.Errorf("%s: %v", name, err)
		}
	}
}
