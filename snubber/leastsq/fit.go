package leastsq

import (
	"context"
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// Fit minimises the sum of the squares of the problem's residuals by the Levenberg-Marquardt method, from its
// Start. How it ended is the result's Status; an error means that there is no result: the problem or the options make
// no sense, or the residuals at Start are not finite.
//
// The context is asked before each step and each Jacobian; when it has ended, the best parameters so far come back with
// the status Stopped. The problem's functions are called one at a time.
func Fit(ctx context.Context, problem Problem, options Options) (*Result, error) {
	if err := problem.check(); err != nil {
		return nil, fmt.Errorf("fit: %w", err)
	}
	options, err := options.fill(&problem)
	if err != nil {
		return nil, fmt.Errorf("fit: options: %w", err)
	}
	s := newSolver(&problem, options)
	for j, p := range problem.Start {
		s.q[j] = problem.bound(j).inside(p)
	}
	s.cost = s.evaluate(s.r, s.p, s.q)
	copy(s.p, problem.Start) // not by way of the transformation and back
	if !finite(s.cost) {
		return nil, fmt.Errorf("fit: the residuals at the start %v have the sum of squares %g: start where the model has values",
			problem.Start, s.cost)
	}
	status, reason := s.iterate(ctx)
	return s.result(status, reason), nil
}

// solver is one fit under way. Lengths: q, p and the like the parameters', r and the like the residuals'.
type solver struct {
	pr *Problem
	o  Options

	q, p, r []float64 // the best point: free parameters, parameters, residuals
	cost    float64   // what is minimised, there
	jac     *mat.Dense

	q1, p1, r1 []float64 // the point on trial
	work       []float64 // residuals to be overwritten
	lin        *linearised

	probe        []float64 // finite differences: parameters, residuals on either side, Ridders's table
	hi, lo       []float64
	table, next  [][]float64
	evaluations  int
	iterations   int
	mu, nu       float64
	offset, from float64 // relative offset now and before the last undamped step
}

func newSolver(pr *Problem, o Options) *solver {
	m, n := pr.N, len(pr.Start)
	f := make([]float64, 5*n+3*m+m*n)
	take := func(k int) []float64 { v := f[:k:k]; f = f[k:]; return v }
	s := &solver{
		pr: pr, o: o, mu: mu0, nu: 2, from: math.Inf(1),
		q: take(n), p: take(n), r: take(m), q1: take(n), p1: take(n), r1: take(m),
		work: take(m), probe: take(n), jac: mat.NewDense(m, n, take(m*n)),
	}
	s.lin = newLinearised(n)
	if pr.Jacobian == nil {
		s.hi, s.lo = make([]float64, m), make([]float64, m)
		s.table, s.next = make([][]float64, ridders), make([][]float64, ridders)
		for k := range ridders {
			s.table[k], s.next[k] = make([]float64, m), make([]float64, m)
		}
	}
	return s
}

func (s *solver) workMatrix() blas64.General {
	return blas64.General{Rows: len(s.work), Cols: 1, Stride: 1, Data: s.work}
}

// evaluate writes the parameters of q into p and the residuals there into r, and gives what is minimised; +Inf where
// a parameter has left the numbers.
func (s *solver) evaluate(r, p, q []float64) float64 {
	for j := range q {
		if p[j], _ = s.pr.bound(j).outside(q[j]); !finite(p[j]) {
			return math.Inf(1)
		}
	}
	s.pr.Residuals(r, p)
	s.evaluations++
	var sum float64
	for _, v := range r {
		v *= v
		if s.o.Loss != nil {
			v, _ = s.o.Loss(v)
		}
		sum += v
	}
	return sum
}

// weigh multiplies the Jacobian and the residuals in s.work by the robust weights of the residuals s.r.
func (s *solver) weigh() {
	copy(s.work, s.r)
	if s.o.Loss == nil {
		return
	}
	for i, v := range s.r {
		_, slope := s.o.Loss(v * v)
		w := math.Sqrt(slope)
		s.work[i] *= w
		row := s.jac.RawRowView(i)
		for j := range row {
			row[j] *= w
		}
	}
}

// linearise takes the Jacobian at the best point and factors it; ok is false where it is not finite.
func (s *solver) linearise() (ok bool) {
	s.differentiate(false)
	s.weigh()
	for j := range s.q {
		_, slope := s.pr.bound(j).outside(s.q[j])
		if s.held(j) {
			slope = 0
		}
		blas64.Scal(slope, column(s.jac.RawMatrix(), j))
	}
	if !finiteMatrix(s.jac) {
		return false
	}
	length := blas64.Nrm2(blas64.Vector{N: len(s.work), Inc: 1, Data: s.work})
	s.lin.factor(s.jac.RawMatrix(), s.workMatrix(), s.tolerance())
	s.offset = 0
	if length > 0 {
		s.offset = s.lin.projection() / length
	}
	return true
}

// held says whether parameter j lies against a bound, nearer than a float64 has use for, with chi2 falling further
// beyond it; s.jac and s.work hold the Jacobian and the residuals, weighted.
func (s *solver) held(j int) bool {
	b, p := s.pr.bound(j), s.p[j]
	down, up := b.room(p)
	least, from := b.room(s.pr.Start[j])
	low, high := down <= touching*least && b.hasLower, up <= touching*from && b.hasUpper
	if !low && !high {
		return false
	}
	var rise float64 // of chi2 with p
	for i, v := range s.work {
		rise += s.jac.At(i, j) * v
	}
	return low && rise > 0 || high && rise < 0
}

// touching is the distance of a parameter from a bound, as a part of where it started, that counts as none.
const touching = 1e-10

func finiteMatrix(a *mat.Dense) bool {
	for _, v := range a.RawMatrix().Data {
		if !finite(v) {
			return false
		}
	}
	return true
}

// tolerance is the part of a factored Jacobian that is rounding.
func (s *solver) tolerance() float64 {
	if s.pr.Jacobian != nil {
		return s.o.Rank
	}
	return max(s.o.Rank, 1e-10)
}
