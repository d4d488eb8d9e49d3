package snubber_test

import (
	"math"
	"testing"
	"time"

	"ringbook/snubber"
	"ringbook/snubber/scipytest"
)

var (
	benchLoop = snubber.Loop{Inductance: 12e-9, Capacitance: 180e-12, Resistance: 0.4}
	benchRC   = snubber.Network{Kind: snubber.RC, C: 560e-12, R: 8.2}
	benchEdge = snubber.Excitation{Bus: 48, Current: 4}
)

func BenchmarkTurnOffRC(b *testing.B) { benchmarkTurnOff(b, benchRC) }

func BenchmarkTurnOffRCD(b *testing.B) {
	n := benchRC
	n.Kind, n.DiodeDrop, n.DiodeOhm, n.ESR = snubber.RCD, 0.7, 0.3, 0.05
	benchmarkTurnOff(b, n)
}

func BenchmarkTurnOffRCDInductive(b *testing.B) {
	n := benchRC
	n.Kind, n.DiodeDrop, n.DiodeOhm, n.ESR, n.RInductance = snubber.RCD, 0.7, 0.3, 0.05, 4e-9
	benchmarkTurnOff(b, n)
}

func benchmarkTurnOff(b *testing.B, n snubber.Network) {
	b.ReportAllocs()
	for b.Loop() {
		u, err := snubber.TurnOff(benchLoop, n, benchEdge)
		if err != nil || u.Peak.Volts < 48 {
			b.Fatal("no peak", err)
		}
	}
}

// The exact peak of an RC network against SciPy's solve_ivp (RK45 at the loosest rtol, a power of ten, that has it to 1e-6).
func BenchmarkTurnOffPeakAgainstSciPy(b *testing.B) {
	l, n, e := benchLoop, benchRC, benchEdge
	var scipy struct{ Seconds, Peak float64 }
	scipytest.Run(b, "testdata/turnoff_time.py", []float64{l.Inductance, l.Capacitance, l.Resistance, n.R, n.C, e.Bus, e.Current}, &scipy)
	peak := 0.0
	for b.Loop() {
		r, _ := snubber.Respond(l, n, e)
		peak = r.Peak().Volts
	}
	if math.Abs(peak/scipy.Peak-1) > 1e-6 {
		b.Fatalf("exact peak %.9g V, SciPy %.9g V", peak, scipy.Peak)
	}
	b.ReportMetric(scipy.Seconds/b.Elapsed().Seconds()*float64(b.N), "times-faster")
}

// The exact peak of an RC network against integrating it to 1e-6 with Dormand and Prince's method (J. Comp. Appl. Math. 6,
// 19, 1980, from memory) in the same run.
func BenchmarkTurnOffPeakAgainstIntegration(b *testing.B) {
	exact := func() float64 {
		r, _ := snubber.Respond(benchLoop, benchRC, benchEdge)
		return r.Peak().Volts
	}
	want := exact()
	if got := integratedPeak(); math.Abs(got/want-1) > 1e-6 {
		b.Fatalf("integrated peak %.9g V, exact %.9g V", got, want)
	}
	var closed, integrated time.Duration
	const many = 200
	n := 0
	for b.Loop() {
		start := time.Now()
		for range many {
			exact()
		}
		mid := time.Now()
		integratedPeak()
		closed, integrated = closed+mid.Sub(start), integrated+time.Since(mid)
		n++
	}
	b.ReportMetric(float64(closed.Nanoseconds())/float64(many*n), "ns/exact")
	b.ReportMetric(float64(integrated)/float64(closed)*many, "times-faster")
}

// integratedPeak integrates the benchmark's circuit over 1.5 periods of the bare loop, the step sized for 1e-6 of the answer,
// and takes the top from the cubic of each step.
func integratedPeak() float64 {
	l, n, e := benchLoop, benchRC, benchEdge
	f := func(x [3]float64) [3]float64 {
		i := (x[1] - x[2]) / n.R
		return [3]float64{(e.Bus - x[1] - l.Resistance*x[0]) / l.Inductance, (x[0] - i) / l.Capacitance, i / n.C}
	}
	a := [6][]float64{{1. / 5}, {3. / 40, 9. / 40}, {44. / 45, -56. / 15, 32. / 9},
		{19372. / 6561, -25360. / 2187, 64448. / 6561, -212. / 729},
		{9017. / 3168, -355. / 33, 46732. / 5247, 49. / 176, -5103. / 18656},
		{35. / 384, 0, 500. / 1113, 125. / 192, -2187. / 6784, 11. / 84}}
	d := [7]float64{71. / 57600, 0, -71. / 16695, 71. / 1920, -17253. / 339200, 22. / 525, -1. / 40}
	const tol = 1e-8
	scale := [3]float64{e.Current * 4, e.Bus, e.Bus}
	x := [3]float64{e.Current}
	h, best, end := 1e-12, 0.0, 1.5/l.NaturalHz()
	var k [7][3]float64
	k[0] = f(x)
	for t := 0.0; t < end; {
		y := x
		for s, row := range a {
			y = x
			for j, c := range row {
				for i := range y {
					y[i] += h * c * k[j][i]
				}
			}
			k[s+1] = f(y)
		}
		worst := 0.0
		for i := range y {
			off := 0.0
			for j, c := range d {
				off += h * c * k[j][i]
			}
			worst = math.Max(worst, math.Abs(off)/(tol*scale[i]))
		}
		if worst <= 1 {
			if s0, s1 := k[0][1], k[6][1]; s0 > 0 && s1 <= 0 {
				// Hermite's cubic, its top by bisection.
				at := func(u float64) (v, slope float64) {
					dv := y[1] - x[1]
					c2, c3 := 3*dv-h*(2*s0+s1), h*(s0+s1)-2*dv
					return x[1] + u*(h*s0+u*(c2+u*c3)), h*s0 + u*(2*c2+3*u*c3)
				}
				lo, hi := 0.0, 1.0
				for range 40 {
					mid := (lo + hi) / 2
					if _, s := at(mid); s > 0 {
						lo = mid
					} else {
						hi = mid
					}
				}
				v, _ := at(lo)
				best = math.Max(best, v)
			}
			t, x, k[0] = t+h, y, k[6]
		}
		h *= math.Min(5, math.Max(0.2, 0.9*math.Pow(worst+1e-12, -0.2)))
	}
	return best
}
