package leastsq

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// partSystem is the linearised system A x = -b of a partitioned problem. Base unknowns are the shared parameters, then
// the nuisances of the second kind; those of the first kind are eliminated.
type partSystem struct {
	shared, base, first int

	a     *mat.SymDense // base by base
	b     []float64     // base
	parts []firstPart

	scale []float64 // the largest diagonal each base unknown has had, for Marquardt's scaling (More 1978)

	reduced *mat.SymDense
	rhs     *mat.VecDense
	chol    mat.Cholesky
	cov     *mat.SymDense

	stepP, stepD []float64
}

// firstPart is what a nuisance of the first kind has in the system.
type firstPart struct {
	a, b  float64
	p     []float64 // with the shared parameters
	with  []int     // nuisances of the second kind that it meets, from 0
	c     []float64 // and its elements with them
	scale float64

	spread   []float64 // see spread; nil: not yet asked for
	variance float64
}

func newPartSystem(shared, first, second int) *partSystem {
	base := shared + second
	s := &partSystem{shared: shared, base: base, first: first,
		a: mat.NewSymDense(base, nil), b: make([]float64, base), parts: make([]firstPart, first),
		scale: make([]float64, base), reduced: mat.NewSymDense(base, nil), rhs: mat.NewVecDense(base, nil),
		stepP: make([]float64, shared), stepD: make([]float64, first+second)}
	store := make([]float64, first*shared)
	for j := range s.parts {
		s.parts[j].p = store[j*shared : (j+1)*shared]
	}
	return s
}

// clear starts a linearisation with the priors, at nuisances d.
func (s *partSystem) clear(d []float64) {
	s.a.Zero()
	clear(s.b)
	for j := range s.parts {
		q := &s.parts[j]
		q.a, q.b, q.spread = 1, d[j], nil
		clear(q.p)
		clear(q.c)
	}
	for k := s.shared; k < s.base; k++ {
		s.a.SetSym(k, k, 1)
		s.b[k] = d[s.first+k-s.shared]
	}
}

// add takes in a block with its rows weighted by w.
func (s *partSystem) add(b *Block, w float64) {
	n := s.shared
	raw := s.a.RawSymmetric()
	for i, r := range b.R {
		row := b.P[i*n : (i+1)*n]
		for j, x := range row {
			wx := w * x
			s.b[j] += wx * r
			for k := j; k < n; k++ {
				raw.Data[j*raw.Stride+k] += wx * row[k]
			}
		}
		var second float64
		if b.Second >= 0 {
			second = b.D[1][i]
			k := n + b.Second
			s.b[k] += w * second * r
			raw.Data[k*raw.Stride+k] += w * second * second
			for j, x := range row {
				raw.Data[j*raw.Stride+k] += w * x * second
			}
		}
		if b.First >= 0 {
			q := &s.parts[b.First]
			d := w * b.D[0][i]
			q.a += d * b.D[0][i]
			q.b += d * r
			for j, x := range row {
				q.p[j] += d * x
			}
			if b.Second >= 0 {
				*q.meets(b.Second) += d * second
			}
		}
	}
}

// meets is the element of the part with a nuisance of the second kind.
func (q *firstPart) meets(second int) *float64 {
	for i, k := range q.with {
		if k == second {
			return &q.c[i]
		}
	}
	q.with, q.c = append(q.with, second), append(q.c, 0)
	return &q.c[len(q.c)-1]
}

// reduce eliminates the nuisances of the first kind from the system damped by mu.
func (s *partSystem) reduce(mu float64) {
	s.reduced.CopySym(s.a)
	for j := range s.base {
		s.scale[j] = math.Max(s.scale[j], s.a.At(j, j))
		s.reduced.SetSym(j, j, s.a.At(j, j)+mu*s.scale[j])
		s.rhs.SetVec(j, -s.b[j])
	}
	raw := s.reduced.RawSymmetric()
	n := s.shared
	for j := range s.parts {
		q := &s.parts[j]
		q.scale = math.Max(q.scale, q.a)
		d := q.a + mu*q.scale
		for i, x := range q.p {
			f := x / d
			s.rhs.SetVec(i, s.rhs.AtVec(i)+f*q.b)
			for k := i; k < n; k++ {
				raw.Data[i*raw.Stride+k] -= f * q.p[k]
			}
			for m, k := range q.with {
				raw.Data[i*raw.Stride+n+k] -= f * q.c[m]
			}
		}
		for m, k := range q.with {
			f := q.c[m] / d
			s.rhs.SetVec(n+k, s.rhs.AtVec(n+k)+f*q.b)
			for m2, k2 := range q.with {
				if k2 >= k {
					raw.Data[(n+k)*raw.Stride+n+k2] -= f * q.c[m2]
				}
			}
		}
	}
}

// solve finds the step damped by mu; false where the system is not positive definite.
func (s *partSystem) solve(mu float64) bool {
	s.reduce(mu)
	if !s.chol.Factorize(s.reduced) {
		return false
	}
	var x mat.VecDense
	if err := s.chol.SolveVecTo(&x, s.rhs); err != nil {
		if _, bad := err.(mat.Condition); !bad {
			return false
		}
	}
	for j := range s.shared {
		s.stepP[j] = x.AtVec(j)
	}
	for k := s.shared; k < s.base; k++ {
		s.stepD[s.first+k-s.shared] = x.AtVec(k)
	}
	for j := range s.parts {
		q := &s.parts[j]
		v := -q.b
		for i, p := range q.p {
			v -= p * s.stepP[i]
		}
		for m, k := range q.with {
			v -= q.c[m] * x.AtVec(s.shared+k)
		}
		s.stepD[j] = v / (q.a + mu*q.scale)
	}
	return true
}

// predicted is the fall of chi2 that the linearised problem promises for the last step, damped by mu: with
// (A + mu D) x = -b, it is -b'x + mu x'D x.
func (s *partSystem) predicted(mu float64) float64 {
	fall := 0.0
	one := func(b, x, scale float64) { fall += -b*x + mu*scale*x*x }
	for j := range s.shared {
		one(s.b[j], s.stepP[j], s.scale[j])
	}
	for k := s.shared; k < s.base; k++ {
		one(s.b[k], s.stepD[s.first+k-s.shared], s.scale[k])
	}
	for j := range s.parts {
		one(s.parts[j].b, s.stepD[j], s.parts[j].scale)
	}
	return fall
}

// covariance is the inverse of the undamped reduced system; false where it has no full rank: an eigenvalue of the
// system scaled to a unit diagonal of at most rank, or so little left of a diagonal by the elimination that it may be
// rounding.
func (s *partSystem) covariance(rank float64) (*mat.SymDense, bool) {
	s.cov = nil
	s.reduce(0)
	n := s.base
	root := make([]float64, n)
	for i := range n {
		v := s.reduced.At(i, i)
		if !(v > 64*epsilon*s.a.At(i, i)) || math.IsInf(v, 0) {
			return nil, false
		}
		root[i] = math.Sqrt(v)
	}
	scaled := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			scaled.SetSym(i, j, s.reduced.At(i, j)/(root[i]*root[j]))
		}
	}
	var eig mat.EigenSym
	if !eig.Factorize(scaled, true) {
		return nil, false
	}
	values := eig.Values(nil)
	if !(values[0] > rank) {
		return nil, false
	}
	var v mat.Dense
	eig.VectorsTo(&v)
	cov := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			sum := 0.0
			for k, e := range values {
				sum += v.At(i, k) * v.At(j, k) / e
			}
			cov.SetSym(i, j, sum/(root[i]*root[j]))
		}
	}
	s.cov = cov
	return cov, true
}

// spread is the covariance of nuisance j of the first kind with the base unknowns, and its variance. With the others at
// their best it follows the base by g = -(row of the base)/a, so that the former is cov g and the latter 1/a + g' cov g.
// They are kept: many blocks see one part.
func (s *partSystem) spread(j int) (with []float64, variance float64) {
	q := &s.parts[j]
	if q.spread != nil {
		return q.spread, q.variance
	}
	g := make([]float64, s.base)
	for i, p := range q.p {
		g[i] = -p / q.a
	}
	for m, k := range q.with {
		g[s.shared+k] = -q.c[m] / q.a
	}
	var w mat.VecDense
	v := mat.NewVecDense(s.base, g)
	w.MulVec(s.cov, v)
	q.spread, q.variance = w.RawVector().Data, 1/q.a+mat.Dot(v, &w)
	return q.spread, q.variance
}

// cross is the covariance of a nuisance with the shared parameters.
func (s *partSystem) cross(j int) []float64 {
	out := make([]float64, s.shared)
	if j < s.first {
		with, _ := s.spread(j)
		copy(out, with)
		return out
	}
	for i := range out {
		out[i] = s.cov.At(i, s.shared+j-s.first)
	}
	return out
}

// joint is the covariance of the shared parameters and up to two nuisances.
func (s *partSystem) joint(first, second int) *mat.SymDense {
	n := s.shared
	size, at := n, n
	if first >= 0 {
		size++
	}
	if second >= 0 {
		size++
	}
	c := mat.NewSymDense(size, nil)
	for i := range n {
		for j := i; j < n; j++ {
			c.SetSym(i, j, s.cov.At(i, j))
		}
	}
	var with []float64
	if first >= 0 {
		var v float64
		with, v = s.spread(first)
		for i := range n {
			c.SetSym(i, at, with[i])
		}
		c.SetSym(at, at, v)
		at++
	}
	if second >= 0 {
		k := n + second
		for i := range n {
			c.SetSym(i, at, s.cov.At(i, k))
		}
		c.SetSym(at, at, s.cov.At(k, k))
		if first >= 0 {
			c.SetSym(at-1, at, with[k])
		}
	}
	return c
}
