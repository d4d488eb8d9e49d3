package snubber

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

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
	s := sumOf(shares)
	if s == nil {
		return normal95
	}
	k := 1.8
	for range 20 {
		inside, density := s.inside(k)
		next := k + (0.95-inside)/density
		next = math.Min(math.Max(next, 1.5), 2.2)
		if math.Abs(next-k) < 1e-6 {
			return next
		}
		k = next
	}
	return k
}

// errorSum is the characteristic function of a sum of rectangular errors and a normal rest, at multiples of errorStep.
type errorSum struct{ ts, phis []float64 }

const errorStep = 0.2

// sumOf is the sum of the rectangular errors of given shares and of the rest; nil where it is as good as normal.
func sumOf(shares []float64) *errorSum {
	var large []float64
	rest := 1.0
	for _, w := range shares {
		if w*w > 0.02 { // smaller ones are normal enough in the company of the rest
			large = append(large, math.Sqrt(3)*w)
			rest -= w * w
		}
	}
	if len(large) == 0 {
		return nil
	}
	const floor = 0.01 // of the variance: what keeps the integral short
	rest = math.Max(rest, floor)
	var s errorSum
	for t := errorStep; ; t += errorStep {
		phi := math.Exp(-rest * t * t / 2)
		if phi < 1e-9 {
			break
		}
		for _, a := range large {
			phi *= math.Sin(a*t) / (a * t)
		}
		s.ts, s.phis = append(s.ts, t), append(s.phis, phi)
	}
	return &s
}

// inside is the probability that the sum lies within k standard uncertainties, and its derivative by k.
func (s *errorSum) inside(k float64) (p, density float64) {
	p, density = k/2, 0.5 // half the trapezoid's first point: sin(k t)/t = k, cos = 1
	for i, t := range s.ts {
		sin, cos := math.Sincos(k * t)
		p += s.phis[i] * sin / t
		density += s.phis[i] * cos
	}
	return 2 / math.Pi * errorStep * p, 2 / math.Pi * errorStep * density
}

// law is the distribution of an error in units of its standard uncertainty: a sum of rectangular errors with the given
// shares and of a normal rest, known to so many effective degrees of freedom (0: very many).
type law struct {
	shares []float64
	dof    float64
}

// factor is the half-width of the 95 % interval (GUM G.3 and Supplement 1).
func (l law) factor() float64 {
	k := coverageFactor(l.shares)
	if l.dof > 0 {
		k *= distuv.StudentsT{Sigma: 1, Nu: l.dof}.Quantile(0.975) / normal95
	}
	return k
}

// inside is the probability of an error of at most z >= 0 in size: 0.95 at factor. A wider one than 6 is as probable as a
// normal one, which bounds it.
func (l law) inside(z float64) float64 {
	s := sumOf(l.shares)
	if l.dof > 0 { // the normal error as improbable as Student's, so that the tails are his
		k := coverageFactor(l.shares) / normal95
		z = k * distuv.UnitNormal.Quantile(1-distuv.StudentsT{Sigma: 1, Nu: l.dof}.Survival(z/k))
	}
	if s == nil || z > 6 {
		return math.Erf(z / math.Sqrt2)
	}
	p, _ := s.inside(z)
	return math.Min(math.Max(p, 0), 1)
}
