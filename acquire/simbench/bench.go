package simbench

import (
	"context"
	"fmt"
	"math/rand/v2"
	"net"
	"strconv"
	"sync"
	"time"

	"ringbook/acquire/simbench/device"
)

// Names lists the instruments of the bench.
func Names() []string {
	return []string{"scope", "supply", "counter", "fixture", "thermometer", "relays", "trouble"}
}

// Bench is a running bench: its instruments answer until it is closed. It is safe for concurrent use.
type Bench struct {
	model       *Model
	instruments map[string]*device.Instrument
	addresses   map[string]string

	ctx    context.Context // of everything that serves; cancelled by Close
	cancel context.CancelFunc
	serves sync.WaitGroup
	ending sync.Mutex // so that nothing begins to serve once Close waits

	clock func() time.Duration // the bench's time; 0 at its start

	mu       sync.Mutex // of what is below, the state of the bench
	network  Network    // as soldered in
	closed   []bool     // the relays, channel 1 first
	mistakes []Mistake
	setV     float64 // V: what the supply is set to
	output   output
	loadA    float64 // A
	captures uint64  // how many have been taken
	kept     *Capture
	format   sampleFormat // of the scope's samples
	meters   *rand.Rand
	gains    map[string]float64 // each meter's own error, a fraction of its bound
	drift    *rand.Rand         // of the thermometer
}

// Start sets up the bench, bare and with the supply on, and serves each instrument on its own TCP port of
// the loopback interface, until ctx is cancelled or the bench is closed.
func Start(ctx context.Context, cfg Config) (*Bench, error) {
	model, err := New(cfg)
	if err != nil {
		return nil, err
	}
	b := &Bench{
		model: model, instruments: map[string]*device.Instrument{}, addresses: map[string]string{},
		network: Network{Kind: Bare}, closed: make([]bool, len(cfg.Relays)),
		setV: cfg.BusV, output: longOn(cfg), loadA: cfg.LoadA, format: startFormat,
		meters: rand.New(rand.NewPCG(cfg.Seed, 0x6d65746572)), gains: map[string]float64{},
		drift: rand.New(rand.NewPCG(cfg.Seed, 0x68656174)),
	}
	start := time.Now()
	b.clock = func() time.Duration { return time.Duration(cfg.Bus.Speed * float64(time.Since(start))) }
	// A seed stands for the same errors as ever: those that read one stream of numbers keep their places in it.
	for _, name := range []string{"scope", "supply", "counter", "fixture"} {
		b.gains[name] = 2*b.meters.Float64() - 1
	}
	b.gains["thermometer"] = 2*b.drift.Float64() - 1
	for name, build := range map[string]func() (*device.Instrument, error){
		"scope": b.newScope, "supply": b.newSupply, "counter": b.newCounter, "fixture": b.newFixture,
		"thermometer": b.newThermometer, "relays": b.newRelays, "trouble": b.newTrouble,
	} {
		if b.instruments[name], err = build(); err != nil {
			return nil, fmt.Errorf("start the simulated bench: %w", err)
		}
	}
	b.ctx, b.cancel = context.WithCancel(ctx)
	for _, name := range Names() {
		address := net.JoinHostPort("127.0.0.1", strconv.Itoa(cfg.Ports[name]))
		ln, err := new(net.ListenConfig).Listen(b.ctx, "tcp", address)
		if err != nil {
			b.Close()
			return nil, fmt.Errorf("start the simulated bench: the %s cannot listen: %w; choose another port, or 0 for any", name, err)
		}
		b.addresses[name] = "tcp://" + ln.Addr().String()
		// It ends when the bench is closed; a listener that fails before leaves the other instruments alone.
		b.serves.Go(func() { _ = b.instruments[name].ServeListener(b.ctx, ln) })
	}
	return b, nil
}

// Close stops serving and waits until every connection is let go. It may be called more than once.
func (b *Bench) Close() {
	b.ending.Lock()
	b.cancel()
	b.ending.Unlock()
	b.serves.Wait()
}

// Addresses gives the address of each instrument by name, as tcp://127.0.0.1:port.
func (b *Bench) Addresses() map[string]string {
	out := map[string]string{}
	for name, address := range b.addresses {
		out[name] = address
	}
	return out
}

// Address is one instrument's address; empty for a name that is none of Names.
func (b *Bench) Address(name string) string { return b.addresses[name] }

// Truth is what is hidden on the board, at the bus voltage and the load set now.
func (b *Bench) Truth() Truth {
	b.mu.Lock()
	defer b.mu.Unlock()
	return truth(b.model.cfg.Board, b.setV, b.loadA)
}

// now integrates the board as it is at this moment; nil while the converter stands still.
func (b *Bench) now() (*record, error) {
	if !b.output.on {
		return nil, nil
	}
	return b.model.record(b.ctx, b.network, b.acrossF(), b.busV(), b.loadA)
}

// read is what a meter of a relative error says about a true value: its own error, always the same, and a
// fifth of the bound as noise.
func (b *Bench) read(name string, bound, value float64) float64 {
	return value * (1 + bound*(b.gains[name]+0.2*b.meters.NormFloat64()))
}
