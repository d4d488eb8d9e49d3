package main

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"os"

	"github.com/rogpeppe/go-internal/testscript"
)

// truth is a board as it was made up: what a fit of its trials is to find.
type truth struct {
	name                string
	l, c, r             float64 // H, F, ohm
	bus, excitation, hz float64 // V, A, Hz
}

// madeUp gives n boards, each with a loop of its own.
func madeUp(n int, rng *rand.Rand) []truth {
	between := func(low, high float64) float64 { return low * math.Pow(high/low, rng.Float64()) }
	var all []truth
	for i := range n {
		b := truth{name: fmt.Sprintf("board %02d", i+1), l: between(5e-9, 40e-9), c: between(100e-12, 800e-12), bus: between(24, 400), hz: between(50e3, 500e3)}
		z := math.Sqrt(b.l / b.c)
		b.r = z * between(0.03, 0.15)
		b.excitation = b.bus / z * between(0.5, 1.5)
		all = append(all, b)
	}
	return all
}

// ring is the closed form of a series circuit L, r, C with the switch across C: at its opening the current is I0 and
// the node at zero. It gives the damped frequency, the envelope's 1/e time and the highest voltage with cx added to C.
// The peak is found by stepping through the first period, so that nothing is shared with the program's own algebra.
func (b truth) ring(cx float64) (hz, decay, peak float64) {
	c := b.c + cx
	a := b.r / (2 * b.l)
	wd := math.Sqrt(1/(b.l*c) - a*a)
	v := func(t float64) float64 {
		return b.bus + math.Exp(-a*t)*(-b.bus*math.Cos(wd*t)+(b.excitation/c-a*b.bus)/wd*math.Sin(wd*t))
	}
	const steps = 4000
	for i := range steps {
		peak = max(peak, v(float64(i)/steps*2*math.Pi/wd))
	}
	return wd / (2 * math.Pi), 1 / a, peak
}

// substituted are the capacitors of a series, F; 0 is the bare node.
var substituted = [...]float64{0, 100e-12, 220e-12, 470e-12, 1e-9, 2.2e-9}

const csvHeader = "board,revision,network,c,c_tol,r,r_tol,probe_c,bus_v,current_a,switching_hz,ring_hz,ring_hz_u,decay_s,decay_s_u,peak_v,peak_v_u,at,part,note\n"

// writeBoards writes the series of every board with noise on each reading and each capacitor off its nominal value.
func writeBoards(w io.Writer, boards []truth, rng *rand.Rand) error {
	const probe, ringU, decayU, peakU, tol = 3.9e-12, 0.002, 0.02, 0.005, 0.01
	out := bufio.NewWriter(w)
	fmt.Fprint(out, csvHeader)
	for i, b := range boards {
		for j, c := range substituted {
			hz, decay, peak := b.ring(c*(1+tol*(2*rng.Float64()-1)) + probe)
			network, cell := "bare", ","
			if c > 0 {
				network, cell = "c", fmt.Sprintf("%g,%g", c, tol)
			}
			fmt.Fprintf(out, "%s,A,%s,%s,,,%g,%.6g,,%.6g,%.6g,%.3g,%.6g,%.3g,%.6g,%.3g,2026-03-%02dT09:%02d:00Z,,\n", b.name, network, cell, probe, b.bus, b.hz,
				hz*(1+ringU*rng.NormFloat64()), hz*ringU, decay*(1+decayU*rng.NormFloat64()), decay*decayU, peak*(1+peakU*rng.NormFloat64()), peak*peakU, 1+i%28, j)
		}
	}
	return out.Flush()
}

// boards N writes boards.csv with the trials of N boards.
func boardsCSV(ts *testscript.TestScript, neg bool, args []string) {
	var n int
	if _, err := fmt.Sscan(args[0], &n); neg || len(args) != 1 || err != nil {
		ts.Fatalf("usage: boards number")
	}
	f, err := os.Create(ts.MkAbs("boards.csv"))
	ts.Check(err)
	defer f.Close()
	rng := rand.New(rand.NewPCG(60, 1))
	ts.Check(writeBoards(f, madeUp(n, rng), rng))
}

// writeRows writes that many trials of one board.
func writeRows(w io.Writer, n int) error {
	out := bufio.NewWriter(w)
	fmt.Fprint(out, "board,revision,network,c,ring_hz,ring_hz_u,peak_v,at\n")
	for i := range n {
		fmt.Fprintf(out, "winch-drive,B,c,%dp,%d,1e5,%g,2026-03-01T09:%02d:%02dZ\n", 100+i%900, 90_000_000-i%1000, 90-float64(i%100)/10, i/60%60, i%60)
	}
	return out.Flush()
}

// peakWith integrates the true board with a resistor and a capacitor in series across the switch, by the classical
// fourth-order Runge-Kutta rule, and gives the highest voltage.
func (b truth) peakWith(r, cs float64) (peak float64) {
	slope := func(x [3]float64) [3]float64 { // current in L, node voltage, voltage of cs
		is := (x[1] - x[2]) / r
		return [3]float64{(b.bus - b.r*x[0] - x[1]) / b.l, (x[0] - is) / b.c, is / cs}
	}
	step := func(x, k [3]float64, h float64) [3]float64 {
		return [3]float64{x[0] + h*k[0], x[1] + h*k[1], x[2] + h*k[2]}
	}
	period := 2 * math.Pi * math.Sqrt(b.l*(b.c+cs))
	h := min(period/4000, r*min(b.c, cs)/20)
	x := [3]float64{b.excitation, 0, 0}
	for t := 0.0; t < 2*period; t += h {
		k1 := slope(x)
		k2 := slope(step(x, k1, h/2))
		k3 := slope(step(x, k2, h/2))
		k4 := slope(step(x, k3, h))
		for i := range x {
			x[i] += h / 6 * (k1[i] + 2*k2[i] + 2*k3[i] + k4[i])
		}
		peak = max(peak, x[1])
	}
	return peak
}

func formatV(v float64) string { return fmt.Sprintf("%.6gV", v) }
