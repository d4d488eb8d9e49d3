package leastsq

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Partitioned is a least-squares problem with a few shared parameters and many nuisances, each of which only some
// blocks of readings see: the true value of a part that was fitted in some of the trials, say. A nuisance is counted in
// units of its prior standard uncertainty about a prior of zero, and that prior is one more reading of the problem.
//
// The nuisances of the first kind, which never meet one another in a block, are eliminated one by one (the Schur
// complement of their block-diagonal; Triggs, McLauchlan, Hartley and Fitzgibbon, "Bundle adjustment - a modern
// synthesis", 2000, section 6, cited from memory), so that the cost grows with the number of blocks and not with its
// square. Those of the second kind stay beside the shared parameters in the reduced system.
//
// The reduced system is one of normal equations, with its columns scaled to length one, unlike everything else here: a
// step need not be exact, and the covariance is right to about (prior/reading)^2 times 1e-16, where prior/reading is how
// many times the prior of a nuisance is wider than the readings that see it. Choose shared parameters that are not
// nearly dependent, or use Fit.
type Partitioned struct {
	Shared int       // number of shared parameters, > 0
	First  int       // number of nuisances of the first kind, >= 0
	Second int       // number of nuisances of the second kind, >= 0
	Blocks int       // number of blocks of readings, > 0
	Start  []float64 // Shared parameters to start from; the nuisances start at 0

	// Eval writes block i at shared parameters p and nuisances d (those of the first kind, then those of the second).
	// It sets every field of b, reusing what b holds; the derivatives only where they are wanted. A residual that is
	// not finite rejects the step.
	Eval func(i int, p, d []float64, derivatives bool, b *Block)
}

// Block is one block of readings: a trial's, say.
type Block struct {
	R      []float64    // whitened residuals, (predicted - read)/u
	P      []float64    // derivatives of R by the shared parameters: len(R) by Shared, row-major
	First  int          // the nuisance of the first kind it sees, from 0; -1: none
	Second int          // the nuisance of the second kind it sees, from 0; -1: none
	D      [2][]float64 // derivatives of R by those two: len(R) each
}

// PartitionedResult is what FitPartitioned found.
type PartitionedResult struct {
	P           []float64 // the shared parameters
	D           []float64 // the nuisances, in units of their priors
	Chi2        float64   // sum of the squared residuals and of the squared nuisances; with a loss, of its rho by block
	Iterations  int
	Evaluations int // of all blocks
	Status      Status
	Reason      string // the status in a sentence

	// Cov is the covariance of the shared parameters from the stated uncertainties, the nuisances' among them; nil
	// where the readings cannot tell a combination of them (Status is Singular).
	Cov *mat.SymDense

	system *partSystem
}

// FitPartitioned finds the shared parameters and nuisances of least chi2, by Levenberg and Marquardt's method with the
// damping of Nielsen 1999 (see the package comment). Options.Rank is the smallest eigenvalue of the scaled reduced
// system at which the readings still tell it, 1e-12 where zero; Options.Loss is applied to a block's sum of squares, so
// that a block goes as a whole.
//
// An error means that there is nothing to fit, or that the start gives no finite residuals.
func FitPartitioned(ctx context.Context, pr Partitioned, o Options) (*PartitionedResult, error) {
	switch {
	case pr.Shared <= 0 || pr.Blocks <= 0 || pr.First < 0 || pr.Second < 0:
		return nil, fmt.Errorf("partitioned fit of %d shared parameters in %d blocks: both must be positive", pr.Shared, pr.Blocks)
	case len(pr.Start) != pr.Shared:
		return nil, fmt.Errorf("partitioned fit: %d start values for %d shared parameters", len(pr.Start), pr.Shared)
	case pr.Eval == nil:
		return nil, errors.New("partitioned fit: Eval is nil")
	}
	if o.MaxIterations == 0 {
		o.MaxIterations = 100
	}
	if o.Offset == 0 {
		o.Offset = 1e-7
	}
	if o.Rank == 0 {
		o.Rank = 1e-12
	}
	s := &partSolver{pr: pr, o: o, res: &PartitionedResult{
		P: append([]float64{}, pr.Start...), D: make([]float64, pr.First+pr.Second)}}
	if s.res.Chi2 = s.cost(s.res.P, s.res.D); !finite(s.res.Chi2) {
		return nil, fmt.Errorf("partitioned fit: the residuals at the start %v are not finite", pr.Start)
	}
	s.iterate(ctx)
	return s.res, nil
}

type partSolver struct {
	pr    Partitioned
	o     Options
	res   *PartitionedResult
	sys   *partSystem
	block Block
	p1    []float64
	d1    []float64
}

// cost is chi2 at a point.
func (s *partSolver) cost(p, d []float64) float64 {
	s.res.Evaluations++
	sum := 0.0
	for _, x := range d {
		sum += x * x
	}
	for i := range s.pr.Blocks {
		s.pr.Eval(i, p, d, false, &s.block)
		rho, _ := s.weigh()
		sum += rho
	}
	return sum
}

// weigh is the block's part of chi2 and the weight of its rows.
func (s *partSolver) weigh() (rho, weight float64) {
	for _, r := range s.block.R {
		rho += r * r
	}
	if s.o.Loss == nil {
		return rho, 1
	}
	return s.o.Loss(rho)
}

func (s *partSolver) linearise() {
	if s.sys == nil {
		s.sys = newPartSystem(s.pr.Shared, s.pr.First, s.pr.Second)
	}
	s.sys.clear(s.res.D)
	for i := range s.pr.Blocks {
		s.pr.Eval(i, s.res.P, s.res.D, true, &s.block)
		_, w := s.weigh()
		s.sys.add(&s.block, w)
	}
}

// iterate moves the result to the minimum.
func (s *partSolver) iterate(ctx context.Context) {
	r := s.res
	s.p1, s.d1 = make([]float64, len(r.P)), make([]float64, len(r.D))
	mu, nu := 1e-4, 2.0
	for ; r.Iterations < s.o.MaxIterations; r.Iterations++ {
		if ctx.Err() != nil {
			r.Status, r.Reason = Stopped, fmt.Sprintf("stopped: %v", context.Cause(ctx))
			return
		}
		s.linearise()
		moved := false
		for mu < 1e12 {
			if !s.sys.solve(mu) {
				mu *= nu
				nu *= 2
				continue
			}
			fall := s.sys.predicted(mu)
			// The fall of chi2 still to come, in units of what one standard uncertainty makes.
			if fall <= s.o.Offset*s.o.Offset*math.Max(1, r.Chi2) {
				s.finish(Converged, "the step vanishes")
				return
			}
			for j := range s.p1 {
				s.p1[j] = r.P[j] + s.sys.stepP[j]
			}
			for j := range s.d1 {
				s.d1[j] = r.D[j] + s.sys.stepD[j]
			}
			cost := s.cost(s.p1, s.d1)
			if gain := (r.Chi2 - cost) / fall; gain > 0 {
				mu *= max(1./3, 1-math.Pow(2*gain-1, 3))
				nu, moved = 2, true
				copy(r.P, s.p1)
				copy(r.D, s.d1)
				r.Chi2 = cost
				break
			}
			mu *= nu
			nu *= 2
		}
		if !moved {
			// At the rounding of chi2 no step lowers it: that is the minimum as near as it can be told.
			if s.sys.solve(0) && s.sys.predicted(0) <= 1e-6*math.Max(1, r.Chi2) {
				s.finish(Converged, "no step lowers chi2 any more")
			} else {
				s.finish(Stalled, "no step lowers chi2, yet its gradient is not zero: the derivatives are wrong or the model not smooth")
			}
			return
		}
	}
	s.linearise()
	s.finish(IterationLimit, fmt.Sprintf("no minimum after %d iterations: start nearer, or allow more", r.Iterations))
}

// finish describes the minimum from the system linearised there.
func (s *partSolver) finish(status Status, reason string) {
	r := s.res
	r.Status, r.Reason = status, reason
	r.system = s.sys
	cov, ok := s.sys.covariance(s.o.Rank)
	if !ok {
		r.Status, r.Reason = Singular, "the readings cannot tell a combination of the shared parameters"
		return
	}
	n := s.pr.Shared
	r.Cov = mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			r.Cov.SetSym(i, j, cov.At(i, j))
		}
	}
}

// Joint is the covariance of the shared parameters, then of the block's nuisances: first (from 0 among the first kind;
// -1: none), then second (likewise). nil where Cov is.
func (r *PartitionedResult) Joint(first, second int) *mat.SymDense {
	if r.Cov == nil {
		return nil
	}
	return r.system.joint(first, second)
}

// Cross is the covariance of nuisance j, of the first kind and then of the second, with each shared parameter; nil where
// Cov is. Since a nuisance's prior is a reading of unit uncertainty, this is also how far each shared parameter moves
// when that prior is off by one standard uncertainty.
func (r *PartitionedResult) Cross(j int) []float64 {
	if r.Cov == nil {
		return nil
	}
	return r.system.cross(j)
}
