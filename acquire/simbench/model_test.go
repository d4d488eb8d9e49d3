package simbench

import (
	"context"
	"errors"
	"go/parser"
	"go/token"
	"math"
	"os"
	"slices"
	"strconv"
	"strings"
	"sync"
	"testing"
)

// TestIndependentWitness: the package shares no code with the rest of the program.
func TestIndependentWitness(t *testing.T) {
	for _, dir := range []string{".", "device"} {
		entries, err := os.ReadDir(dir)
		if err != nil {
			t.Fatal(err)
		}
		for _, e := range entries {
			if !strings.HasSuffix(e.Name(), ".go") || strings.HasSuffix(e.Name(), "_test.go") {
				continue
			}
			file, err := parser.ParseFile(token.NewFileSet(), dir+"/"+e.Name(), nil, parser.ImportsOnly)
			if err != nil {
				t.Fatal(err)
			}
			for _, spec := range file.Imports {
				path, _ := strconv.Unquote(spec.Path.Value)
				if strings.HasPrefix(path, "ringbook/") && path != "ringbook/acquire/simbench/device" {
					t.Errorf("%s/%s imports %s", dir, e.Name(), path)
				}
			}
		}
	}
}

func newModel(t testing.TB, cfg Config) *Model {
	t.Helper()
	m, err := New(cfg)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// TestDefaultBoard holds the invented board to what it is meant to be: a ring within 60 to 110 MHz of quality 8
// to 15, and a bare peak of 90 to 100 V on a 48 V bus.
func TestDefaultBoard(t *testing.T) {
	m := newModel(t, Default())
	truth := m.Truth()
	q := math.Sqrt(truth.Inductance/truth.CapacitanceBus) / truth.Resistance
	r, err := m.Respond(t.Context(), Network{Kind: Bare})
	if err != nil {
		t.Fatal(err)
	}
	if truth.RingHz < 60e6 || truth.RingHz > 110e6 || q < 8 || q > 15 || r.Peak < 90 || r.Peak > 100 || math.Abs(r.Settled-48) > 0.1 {
		t.Errorf("%+v, quality %.1f, %+v", truth, q, r)
	}
}

// TestApparentExcitation: a linear loop with the apparent excitation peaks where the board does, within 1 %,
// with nothing and with capacitors across the node. The linear peak is the second-order overshoot, with
// zeta = r/(2 Z0), chi = I0 Z0/E, w = sqrt(1 - zeta^2):
//
//	1 + sqrt(1 - 2 zeta chi + chi^2) exp(-zeta theta/w), theta = pi - atan2(w chi, 1 - zeta chi)
func TestApparentExcitation(t *testing.T) {
	cfg := Default()
	cfg.Parts.CTol, cfg.Parts.ESR = 0, 0
	m := newModel(t, cfg)
	truth := m.Truth()
	for _, added := range []float64{0, 220e-12, 470e-12, 1e-9} {
		n := Network{Kind: C, C: added}
		if added == 0 {
			n.Kind = Bare
		}
		got, err := m.Respond(t.Context(), n)
		if err != nil {
			t.Fatal(err)
		}
		z0 := math.Sqrt(truth.Inductance / (truth.CapacitanceBus + cfg.ProbeF + added))
		zeta, chi := truth.Resistance/z0/2, truth.Apparent*z0/cfg.BusV
		w := math.Sqrt(1 - zeta*zeta)
		theta := math.Pi - math.Atan2(w*chi, 1-zeta*chi)
		want := cfg.BusV * (1 + math.Sqrt(1-2*zeta*chi+chi*chi)*math.Exp(-zeta*theta/w))
		t.Logf("%g F: %.3f V, linear %.3f V", added, got.Peak, want)
		if math.Abs(got.Peak/want-1) > 0.01 {
			t.Errorf("%g F: %.3f V, linear %.3f V", added, got.Peak, want)
		}
	}
}

// TestParts: the same nominal value is the same part, another value another one, another box others; all
// within tolerance, and spread over it.
func TestParts(t *testing.T) {
	p := Parts{CTol: 0.05, RTol: 0.01, Seed: 7}
	n := Network{Kind: RC, C: 470e-12, R: 10}
	if p.actual(n) != p.actual(n) {
		t.Error("the same part has two values")
	}
	if p.actual(n).C != p.actual(Network{Kind: C, C: 470e-12}).C {
		t.Error("the capacitor changes with its network")
	}
	other := p
	other.Seed = 8
	if p.actual(n).C == other.actual(n).C {
		t.Error("two boxes hold the same part")
	}
	var low, high, mean float64
	for i := range 1000 {
		c := 1e-12 * float64(i+1)
		e := p.actual(Network{Kind: C, C: c}).C/c - 1
		low, high, mean = min(low, e), max(high, e), mean+e/1000
	}
	if low < -0.05 || high > 0.05 || low > -0.049 || high < 0.049 || math.Abs(mean) > 0.003 {
		t.Errorf("errors of a 5 %% part lie in %g to %g, mean %g", low, high, mean)
	}
}

// TestCaptures: a seed gives the same record always, whichever model takes it; other seeds other records.
func TestCaptures(t *testing.T) {
	take := func(m *Model, seed uint64) []uint8 {
		c, err := m.Capture(t.Context(), Network{Kind: RCD, C: 1e-9, R: 10}, seed)
		if err != nil {
			t.Fatal(err)
		}
		return c.Codes
	}
	m := newModel(t, Default())
	first := take(m, 3)
	if !slices.Equal(first, take(m, 3)) || !slices.Equal(first, take(newModel(t, Default()), 3)) {
		t.Error("one seed, two records")
	}
	if slices.Equal(first, take(m, 4)) {
		t.Error("two seeds, one record")
	}
}

// TestModelAtOnce lets several goroutines use one model, more networks than it keeps; the race detector watches.
func TestModelAtOnce(t *testing.T) {
	m := newModel(t, Default())
	var all sync.WaitGroup
	for i := range 4 {
		all.Go(func() {
			for k := range cacheSize {
				n := Network{Kind: RC, C: 1e-9, R: 5 + float64((i+k)%(cacheSize+4))}
				c, err := m.Capture(t.Context(), n, uint64(k))
				if err != nil {
					t.Error(err)
					return
				}
				r, err := m.Respond(t.Context(), n)
				if f := c.Evaluate(); err != nil || math.Abs(f.PeakV-r.Peak) > 2 {
					t.Errorf("%+v: peak read %g V, exact %g V, %v", n, f.PeakV, r.Peak, err)
				}
			}
		})
	}
	all.Wait()
	if len(m.cache) > cacheSize {
		t.Errorf("%d records kept", len(m.cache))
	}
}

func TestModelRefuses(t *testing.T) {
	m := newModel(t, Default())
	if _, err := m.Respond(t.Context(), Network{Kind: "lc", C: 1e-9}); err == nil || !strings.Contains(err.Error(), `"lc"`) {
		t.Errorf("an unknown network: %v", err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := m.Respond(ctx, Network{Kind: Bare}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	// A cancelled integration leaves nothing half done behind.
	if r, err := m.Respond(t.Context(), Network{Kind: Bare}); err != nil || r.Peak < 90 {
		t.Errorf("after it: %+v, %v", r, err)
	}
}

func BenchmarkIntegrate(b *testing.B) {
	for _, c := range []struct {
		name string
		n    Network
	}{{"bare", Network{Kind: Bare}}, {"c", Network{Kind: C, C: 470e-12}}, {"rc", Network{Kind: RC, C: 470e-12, R: 10}}, {"rcd", Network{Kind: RCD, C: 470e-12, R: 10}}} {
		b.Run(c.name, func(b *testing.B) {
			for b.Loop() {
				m := newModel(b, Default())
				if _, err := m.Respond(b.Context(), c.n); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkCaptureAndEvaluate(b *testing.B) {
	m := newModel(b, Default())
	for seed := uint64(0); b.Loop(); seed++ {
		c, err := m.Capture(b.Context(), Network{Kind: C, C: 470e-12}, seed)
		if err != nil {
			b.Fatal(err)
		}
		c.Evaluate()
	}
}

func BenchmarkReadingOverTCP(b *testing.B) {
	bench := started(b)
	scope := dial(b, bench, "scope")
	for b.Loop() {
		scope.ask("MEAS:FREQ?")
	}
}
