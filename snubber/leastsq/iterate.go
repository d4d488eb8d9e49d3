package leastsq

import (
	"context"
	"fmt"
	"math"
)

// nearby is the relative offset below which undamped steps are tried whatever chi2 says: it is flat there to a
// float64's rounding, while the offset still tells better from worse. Where no step lowers chi2, it is also the
// relative size of a full step that may be rounding.
const nearby = 1e-6

// mu0 is the damping to start with, as a fraction of the squared length of a scaled column of the Jacobian.
const mu0 = 1e-3

// leastMu keeps the damping from vanishing, from where no rejected step could bring it back.
const leastMu = 1e-30

// straight is the relative offset below which a step is so short that the model's curvature along it does not matter.
const straight = 1e-3

// iterate moves s to the minimum. It changes s.q, s.p, s.r and s.cost only to better ones.
func (s *solver) iterate(ctx context.Context) (Status, string) {
	for ; s.iterations < s.o.MaxIterations; s.iterations++ {
		if ctx.Err() != nil {
			return Stopped, fmt.Sprintf("stopped: %v", context.Cause(ctx))
		}
		if !s.linearise() {
			return NonFinite, "the Jacobian at the best parameters is not finite"
		}
		s.lin.gaussNewton()
		full := s.lin.length() / s.size()
		if s.arrived() {
			return Converged, "the residuals stand at right angles to the model, or the step vanishes"
		}
		if s.offset <= nearby && s.undamped() {
			continue
		}
		if moved, stopped := s.downhill(ctx); stopped {
			return Stopped, fmt.Sprintf("stopped: %v", context.Cause(ctx))
		} else if !moved {
			if s.offset <= nearby || full <= nearby || s.lin.rank < s.lin.n {
				return Converged, "no step lowers chi2 any more"
			}
			return Stalled, fmt.Sprintf("no step lowers chi2, yet its gradient is not zero (relative offset %.2g): the Jacobian is wrong or the model not smooth", s.offset)
		}
	}
	return IterationLimit, fmt.Sprintf("no minimum after %d iterations: start nearer, or allow more", s.iterations)
}

// arrived says whether the undamped step just found is not worth taking.
func (s *solver) arrived() bool {
	if s.offset <= s.o.Offset || s.lin.length() <= s.o.Step*s.size() {
		return true
	}
	// An undamped step that did not bring the offset down has met the rounding.
	return s.from <= nearby && s.offset > 0.9*s.from
}

// size is |D q|, what a step is held against. A parameter near zero counts by its typical size, the logarithm of one
// with a bound by one.
func (s *solver) size() float64 {
	var sum float64
	for j, q := range s.q {
		least := 1.
		if s.pr.bound(j) == (Bound{}) {
			least = s.pr.typical(j)
		}
		v := s.lin.scale[j] * max(math.Abs(q), least)
		sum += v * v
	}
	return math.Sqrt(sum)
}

// undamped takes the full Gauss-Newton step.
func (s *solver) undamped() bool {
	s.move(1)
	cost := s.evaluate(s.r1, s.p1, s.q1)
	if !(cost <= s.cost*(1+nearby)) {
		return false
	}
	s.from = s.offset
	s.accept(cost)
	return true
}

// downhill takes the first damped step that lowers chi2; moved is false where the steps vanish before one does.
// The damping follows the gain ratio as in Nielsen 1999, equation (2.5).
func (s *solver) downhill(ctx context.Context) (moved, stopped bool) {
	s.from = math.Inf(1)
	for {
		if ctx.Err() != nil {
			return false, true
		}
		s.lin.damped(s.mu)
		if s.lin.length() <= epsilon*s.size() || s.mu > 1e40 {
			return false, false
		}
		predicted := s.lin.predicted(s.mu)
		if s.offset <= straight || s.bend() {
			s.move(1)
			cost := s.evaluate(s.r1, s.p1, s.q1)
			if gain := (s.cost - cost) / predicted; gain > 0 { // not so where cost is a NaN or an infinity
				s.mu = max(leastMu, s.mu*max(1./3, 1-math.Pow(2*gain-1, 3)))
				s.nu = 2
				s.accept(cost)
				return true, false
			}
		}
		s.mu *= s.nu
		s.nu *= 2
	}
}

// bend adds the geodesic acceleration to the damped step; ok is false where it outweighs the step, which is then too
// long for the linearised problem to mean anything. Transtrum and Sethna, "Improvements to the
// Levenberg-Marquardt algorithm for nonlinear least-squares minimization", arXiv:1201.5885 (2012),
// sections 2.3 and 2.4, with their difference step of a tenth of the step and, for their bound of 0.75, 0.3: with it the
// certified sets are reached for any first damping from 1e-6 to 1.
func (s *solver) bend() (ok bool) {
	const h = 0.1
	s.move(h)
	if !finite(s.evaluate(s.r1, s.p1, s.q1)) {
		return false
	}
	s.lin.along(s.workMatrix())
	for i, along := range s.work {
		change := s.r1[i] - s.r[i]
		if s.o.Loss != nil {
			_, slope := s.o.Loss(s.r[i] * s.r[i])
			change *= math.Sqrt(slope)
		}
		s.work[i] = 2 / h * (change/h - along)
	}
	length := s.lin.length()
	return 2*s.lin.accelerate(s.workMatrix()) <= 0.3*length
}

// move writes the best point plus a part of the last step to s.q1.
func (s *solver) move(part float64) {
	for j, d := range s.lin.step {
		s.q1[j] = s.q[j] + part*d
	}
}

func (s *solver) accept(cost float64) {
	s.q, s.q1 = s.q1, s.q
	s.p, s.p1 = s.p1, s.p
	s.r, s.r1 = s.r1, s.r
	s.cost = cost
}

// result describes the best point.
func (s *solver) result(status Status, reason string) *Result {
	n := len(s.p)
	res := &Result{P: s.p, Residuals: s.r, Chi2: s.cost, Dof: s.pr.N - n, Iterations: s.iterations,
		Status: status, Reason: reason, AtBound: make([]bool, n)}
	s.differentiate(status != Stopped) // who has stopped the fit does not wait for the best differences
	s.weigh()
	for j := range n {
		res.AtBound[j] = s.held(j)
	}
	res.Evaluations = s.evaluations
	if !finiteMatrix(s.jac) {
		res.Status, res.Reason = NonFinite, "the Jacobian at the best parameters is not finite"
		return res
	}
	res.describe(s.jac, s.o.Rank)
	if status == Converged && len(res.Blind) > 0 {
		res.Status, res.Reason = Singular, res.blindness(s.pr.name)
	}
	return res
}
