package snubber_test

import (
	"context"
	"errors"
	"math"
	"math/cmplx"
	"testing"

	"ringbook/snubber"
)

// fourier is the size of the transform of samples of v(t) - E, h seconds apart, at w: Simpson's rule.
func fourier(samples []float64, h, w float64) float64 {
	sum, turn, step := complex(0, 0), complex(1, 0), cmplx.Exp(complex(0, -w*h))
	for i, v := range samples {
		k := float64(2 + 2*(i%2))
		if i == 0 || i == len(samples)-1 {
			k = 1
		}
		sum += complex(k*v, 0) * turn
		turn *= step
	}
	return cmplx.Abs(sum) * h / 3
}

// The level of the ring beside the Fourier integral of the waveform, whose top is looked for on a fine grid.
func TestRingLevelIsTheFourierIntegral(t *testing.T) {
	l := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.4}
	unit := math.Sqrt(l.Inductance * l.Capacitance)
	tail := 20 * 2 * l.Inductance / l.Resistance
	level := func(n snubber.Network, e snubber.Excitation) float64 {
		r, err := snubber.Respond(l, n, e)
		if err != nil {
			t.Fatal(err)
		}
		hz, ok := r.RingHz()
		if !ok {
			t.Fatalf("%+v does not ring", n)
		}
		h := unit / 50
		samples := make([]float64, 2*int(tail/h/2)+1)
		for i := range samples {
			samples[i] = r.NodeAt(float64(i)*h) - e.Bus
		}
		best, at := 0.0, 1.0
		for _, step := range []float64{1e-2, 1e-3, 1e-4} {
			centre := at
			for k := -15.0; k <= 15; k++ {
				x := centre + k*step
				if v := fourier(samples, h, 2*math.Pi*hz*x); v > best {
					best, at = v, x
				}
			}
		}
		return best
	}
	for _, e := range []snubber.Excitation{{Bus: 48}, {Bus: 48, Current: 6}, {Current: 3}} {
		for _, n := range []snubber.Network{{Kind: snubber.C, C: 560e-12}, {Kind: snubber.RC, C: 560e-12, R: 1}, {Kind: snubber.RC, C: 560e-12, R: 1.5, ESR: 1}} {
			got, err := snubber.RingLevel(l, n, e)
			if err != nil {
				t.Fatal(err)
			}
			want := 20 * math.Log10(level(n, e)/level(snubber.Network{Kind: snubber.Bare}, e))
			if math.Abs(got-want) > 1e-4 {
				t.Errorf("%+v %+v: %.4f dB, the Fourier integral %.4f dB", n, e, got, want)
			}
		}
	}
}

// A bare node stands at 0 dB; a network that damps well lies far below; nothing to compare with is an error.
func TestRingLevelLandmarks(t *testing.T) {
	l := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.2}
	e := snubber.Excitation{Bus: 48, Current: 4}
	db, err := snubber.RingLevel(l, snubber.Network{Kind: snubber.Bare}, e)
	if err != nil || db != 0 {
		t.Errorf("bare: %g dB, %v", db, err)
	}
	last := 0.0
	for _, c := range []float64{47e-12, 180e-12, 560e-12, 1.8e-9} {
		db, err := snubber.RingLevel(l, snubber.Network{Kind: snubber.RC, C: c, R: 8.2}, e)
		if err != nil || !(db < last) {
			t.Errorf("%g F: %g dB after %g dB, %v", c, db, last, err)
		}
		last = db
	}
	if last > -20 {
		t.Errorf("ten times the loop's capacitance: %g dB", last)
	}
	rc := snubber.Network{Kind: snubber.RC, C: 1e-9, R: 8.2}
	for what, x := range map[string]struct {
		l snubber.Loop
		n snubber.Network
		e snubber.Excitation
	}{
		"no excitation": {l, rc, snubber.Excitation{}},
		"no loss":       {snubber.Loop{Inductance: 1e-8, Capacitance: 1e-10}, rc, e},
		"no ring":       {snubber.Loop{Inductance: 1e-8, Capacitance: 1e-10, Resistance: 30}, rc, e},
		"bad bus":       {l, rc, snubber.Excitation{Bus: -1}},
	} {
		if db, err := snubber.RingLevel(x.l, x.n, x.e); err == nil {
			t.Errorf("%s: %g dB", what, db)
		}
	}
	if _, err := snubber.RingLevel(l, snubber.Network{Kind: snubber.RCD, C: 1e-9, R: 8.2}, e); !errors.Is(err, snubber.ErrNetwork) {
		t.Errorf("rcd: %v", err)
	}
}

func TestSweep(t *testing.T) {
	l := snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.2}
	e := snubber.Excitation{Bus: 48, Current: 4}
	cs, rs := []float64{180e-12, 560e-12, 1e-9}, []float64{4.7, 10}
	g, err := snubber.Sweep(context.Background(), l, e, 3e5, cs, rs)
	if err != nil {
		t.Fatal(err)
	}
	for i, c := range cs {
		for j, r := range rs {
			n := snubber.Network{Kind: snubber.RC, R: r, C: c}
			resp, _ := snubber.Respond(l, n, e)
			loss, _ := snubber.SwitchingLoss(l, n, e, 3e5)
			if g.C[i] != c || g.R[j] != r || g.Peak[i][j] != resp.Peak().Volts || g.Damping[i][j] != resp.DampingRatio() || g.Loss[i][j] != loss.Total {
				t.Errorf("C = %g F, R = %g ohm: row %d, column %d is not theirs", c, r, i, j)
			}
		}
	}
	stopped, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := snubber.Sweep(stopped, l, e, 3e5, cs, rs); !errors.Is(err, context.Canceled) {
		t.Errorf("stopped: %v", err)
	}
	for _, bad := range [][2][]float64{{nil, rs}, {cs, nil}, {{-1}, rs}, {cs, {0}}} {
		if _, err := snubber.Sweep(context.Background(), l, e, 3e5, bad[0], bad[1]); err == nil {
			t.Errorf("%v: no error", bad)
		}
	}
}
