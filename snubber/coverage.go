package snubber

import "math"

// coverageFactor is the half-width, in standard uncertainties, of the 95 % interval of a quantity whose error is the sum
// of rectangular errors with the given shares of the standard uncertainty, and of a normal rest.
//
// A capacitor's tolerance is a bound: where one or two of them make most of the uncertainty, the error is no normal one
// and 1.96 is too wide (a lone rectangular error has 0.95 sqrt(3) = 1.65). The distribution is taken as it is, by its
// characteristic function (GUM Supplement 1, JCGM 101:2008, propagates distributions by draws; the integral is exact and
// always the same):
//
//	P(|x| < k) = (2/pi) integral over t > 0 of sin(k t)/t exp(-s^2 t^2/2) product of sin(sqrt(3) w t)/(sqrt(3) w t)
func coverageFactor(shares []float64) float64 {
	var large []float64
	rest := 1.0
	for _, w := range shares {
		if w*w > 0.02 { // smaller ones are normal enough in the company of the rest
			large = append(large, math.Sqrt(3)*w)
			rest -= w * w
		}
	}
	if len(large) == 0 {
		return normal95
	}
	const floor = 0.01 // of the variance: what keeps the integral short
	rest = math.Max(rest, floor)
	const step = 0.2
	var ts, phis []float64
	for t := step; ; t += step {
		phi := math.Exp(-rest * t * t / 2)
		if phi < 1e-9 {
			break
		}
		for _, a := range large {
			phi *= math.Sin(a*t) / (a * t)
		}
		ts, phis = append(ts, t), append(phis, phi)
	}
	k := 1.8
	for range 20 {
		inside, density := k/2, 0.5 // half the trapezoid's first point: sin(k t)/t = k, cos = 1
		for i, t := range ts {
			sin, cos := math.Sincos(k * t)
			inside += phis[i] * sin / t
			density += phis[i] * cos
		}
		next := k + (0.95-2/math.Pi*step*inside)/(2/math.Pi*step*density)
		next = math.Min(math.Max(next, 1.5), 2.2)
		if math.Abs(next-k) < 1e-6 {
			return next
		}
		k = next
	}
	return k
}
