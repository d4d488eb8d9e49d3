package snubber

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

func drawValues(t *rapid.T) circuitValues {
	log := func(name string, lo, hi float64) float64 {
		return math.Exp(rapid.Float64Range(math.Log(lo), math.Log(hi)).Draw(t, name))
	}
	v := circuitValues{atL: log("L", 1e-9, 1e-6), atC: log("C", 1e-11, 1e-9), atE: log("E", 5, 500), atRef: 48}
	z := math.Sqrt(v[atL] / v[atC])
	v[atR] = z * log("r", 0.01, 0.3)
	v[atI0] = v[atE] / z * log("chi", 0.05, 3)
	v[atCs] = v[atC] * log("a", 0.2, 20)
	v[atRs] = z * log("rho", 0.05, 5)
	return v
}

// rings skips circuits that hardly ring: where poles meet, a frequency or a decay changes without bound.
func rings(t *rapid.T, v *circuitValues) {
	if r := v.respond(); r.DampingRatio() > 0.8 {
		t.Skip("hardly rings")
	}
}

// With effects of no size the extended predictions are the closed form's: two ways to one answer.
func TestEffectsVanish(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := drawValues(t)
		rings(t, &v)
		want, _ := v.signs(true)
		period := 2 * math.Pi * math.Sqrt(v[atL]*v[atC])
		for what, at := range map[string]int{"fall": atFall, "lead": atLead, "share": atShare} {
			x := v
			x[at] = map[int]float64{atFall: 1e-7 * period, atLead: 1e-7 * v[atL], atShare: 1e-7}[at]
			got, _ := x.signs(true)
			for k := range got {
				if math.Abs(got[k]-want[k]) > 1e-5*math.Abs(want[k]) {
					t.Fatalf("%s: sign %d = %.10g, closed form %.10g", what, k, got[k], want[k])
				}
			}
		}
	})
}

// The fall of the current through the poles and through the circuit's integral is one answer.
func TestFallTwoWays(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := drawValues(t)
		v[atFall] = 2 * math.Pi * math.Sqrt(v[atL]*v[atC]) * rapid.Float64Range(0.01, 1).Draw(t, "fall")
		f, p := newFalling(&v), v.poleSum()
		scale := v[atE] + v[atI0]*math.Sqrt(v[atL]/v[atC])
		for k := range 50 {
			at := float64(k) * v[atFall] / 7
			if a, b := f.at(at), p.at(at); math.Abs(a-b) > 1e-6*scale {
				t.Fatalf("at %g s: %.10g by the integral, %.10g by the poles", at, a, b)
			}
		}
		_, a := f.peak()
		_, b := p.peak()
		if math.Abs(a-b) > 1e-6*scale {
			t.Fatalf("peak %.10g by the integral, %.10g by the poles", a, b)
		}
	})
}

// The derivatives the fit goes by are those of what it predicts.
func TestSlopesAreDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := drawValues(t)
		rings(t, &v)
		switch rapid.IntRange(0, 5).Draw(t, "effect") {
		case 4:
			v[atCs], v[atRs] = 0, 0
		case 5:
			v[atRs] = 0
		case 1:
			v[atFall] = 0.1 * math.Sqrt(v[atL]*v[atC])
		case 2:
			v[atLead] = 0.05 * v[atL]
		case 3:
			v[atShare] = 0.3
		}
		base, when := v.signs(true)
		if math.IsInf(when, 1) || base[ringAt] == 0 {
			t.Skip("no overshoot or no ring")
		}
		d := v.slopes(when)
		for k := atL; k <= atShare; k++ {
			if v[k] == 0 {
				continue
			}
			h := 1e-4 * v[k]
			lo, hi := v, v
			lo[k] -= h
			hi[k] += h
			a, _ := lo.signs(true)
			b, _ := hi.signs(true)
			for q := range d {
				got, want := d[q][k]*v[k], (b[q]-a[q])/(2*h)*v[k]
				if math.Abs(got-want) > 1e-3*math.Abs(want)+1e-4*math.Abs(base[q]) {
					t.Fatalf("sign %d by value %d: %g, by differences %g", q, k, got, want)
				}
			}
		}
	})
}
