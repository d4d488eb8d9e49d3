package simbench

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"sync"
)

// Model is the board and its scope without the instruments' sockets: for studies of many boards. It is
// safe for concurrent use and keeps what it has integrated.
type Model struct {
	cfg Config

	mu    sync.Mutex
	cache map[situation]*record
}

// situation is all that a waveform depends on besides the board.
type situation struct {
	network      Network // as printed on its parts
	across       float64 // F: what relays have put across the node besides, its actual value
	bus, current float64 // V, A: current is the loop's
}

// cacheSize bounds what a model keeps; a series at the bench needs a few.
const cacheSize = 24

// solveTolerance is the relative error allowed in one step of the integration.
const solveTolerance = 1e-9

// New makes a model of a bench.
func New(cfg Config) (*Model, error) {
	if err := cfg.Check(); err != nil {
		return nil, fmt.Errorf("set up the simulated board: %w", err)
	}
	return &Model{cfg: cfg, cache: map[situation]*record{}}, nil
}

// Respond is the exact answer with a network fitted: peak and settled level, no noise, no sampling. The parts
// have their true values, as in Capture.
func (m *Model) Respond(ctx context.Context, n Network) (Response, error) {
	r, err := m.record(ctx, n, 0, m.cfg.BusV, m.cfg.LoadA)
	if err != nil {
		return Response{}, err
	}
	return r.peak, nil
}

// Capture is one record of the scope with a network fitted. The same seed gives the same record.
func (m *Model) Capture(ctx context.Context, n Network, seed uint64) (Capture, error) {
	r, err := m.record(ctx, n, 0, m.cfg.BusV, m.cfg.LoadA)
	if err != nil {
		return Capture{}, err
	}
	return m.cfg.Scope.capture(r, rand.New(rand.NewPCG(m.cfg.Seed, seed))), nil
}

// record integrates a situation, or finds it integrated before.
func (m *Model) record(ctx context.Context, n Network, across, bus, load float64) (*record, error) {
	if err := n.Check(); err != nil {
		return nil, err
	}
	key := situation{network: n, across: across, bus: bus, current: m.cfg.Board.PerLoadA * load}
	m.mu.Lock()
	defer m.mu.Unlock()
	if r, ok := m.cache[key]; ok {
		return r, nil
	}
	actual := m.cfg.Parts.actual(n)
	c := newCircuit(m.cfg.Board, m.cfg.Parts, actual, bus, key.current, m.cfg.ProbeF+across)
	// Long enough for the scope, for one round of a ring too slow for it, and for a creep up to the bus voltage.
	total := m.cfg.Board.CapacitanceAt(0) + m.cfg.ProbeF + across + actual.C
	end := max(m.cfg.Scope.after()+2/m.cfg.Scope.RateHz,
		1.2*2*math.Pi*math.Sqrt(m.cfg.Board.Inductance*total), 10*m.cfg.Board.Resistance*total)
	r, err := c.solve(ctx, end, solveTolerance)
	if err != nil {
		return nil, err
	}
	if len(m.cache) >= cacheSize {
		clear(m.cache)
	}
	m.cache[key] = r
	return r, nil
}
