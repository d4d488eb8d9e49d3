package leastsq

import (
	"fmt"
	"math"
)

// LineFit is the straight line y = Intercept + Slope x through points uncertain in both coordinates.
type LineFit struct {
	Intercept, Slope   float64 // units of y and of y/x
	UIntercept, USlope float64 // standard uncertainties (k = 1) from the stated uncertainties, same units
	Cov                float64 // covariance of intercept and slope
	Chi2               float64 // weighted sum of squares
	Dof                int     // degrees of freedom: points less two
	X, Y               []float64
	// X and Y hold the adjusted points: the least-squares estimate of where on the line each point lies.

	Iterations int
}

// lineIterations bounds the iteration for the slope, which takes about ten.
const lineIterations = 500

// Line fits a straight line to points whose both coordinates carry an uncertainty, by York, Evensen, Martinez and De
// Basabe Delgado, "Unified equations for the slope, intercept, and standard errors of the best straight
// line", Am. J. Phys. 72, 367 (2004), equations (13) (the numbering cited from memory):
//
//	W = 1/(uy^2 + b^2 ux^2 - 2 b r ux uy)            the paper's weights, with w(X) = 1/ux^2, w(Y) = 1/uy^2
//	U = X - sum(W X)/sum(W), V = Y - sum(W Y)/sum(W)
//	beta = W (U uy^2 + b V ux^2 - (b U + V) r ux uy)
//	b = sum(W beta V)/sum(W beta U), repeated until it stands; a = mean(Y) - b mean(X)
//	u(b)^2 = 1/sum(W (x - mean(x))^2), u(a)^2 = 1/sum(W) + mean(x)^2 u(b)^2, cov(a, b) = -mean(x) u(b)^2
//
// where x are the adjusted points' abscissas. Written in variances, it has the limits of exactly known
// coordinates in it: ux or uy may be 0, though not both at one point. The uncertainties are the
// paper's, from the adjusted points and the stated uncertainties; where chi2/dof is to scale them, multiply by its root.
//
// ux and uy hold one standard uncertainty for each point, >= 0, in the units of x and of y; corr the
// correlation of a point's two errors, from -1 to 1 (nil: none). ux nil: x known exactly; uy nil
// likewise; not both.
func Line(x, y, ux, uy, corr []float64) (LineFit, error) {
	ps, f, err := linePoints(x, y, ux, uy, corr)
	if err != nil {
		return LineFit{}, fmt.Errorf("fit a line: %w", err)
	}
	fit := LineFit{Dof: len(x) - 2}
	b := ps.ordinary()
	for settled := false; !settled; {
		if fit.Iterations++; fit.Iterations > lineIterations {
			return LineFit{}, fmt.Errorf("fit a line: no convergence after %d iterations; the slope stands at %g: the points do not make out a line within their uncertainties",
				lineIterations, b*f.y/f.x)
		}
		if i := ps.weigh(b); i >= 0 {
			return LineFit{}, fmt.Errorf("fit a line: point %d (%g, %g) has no uncertainty across the line: state one in y, or in x if the line is not level", i, x[i], y[i])
		}
		last := b
		b = ps.slope()
		if !finite(b) {
			return LineFit{}, fmt.Errorf("fit a line: the slope comes out as %g: the points do not spread in x beyond their uncertainties", b)
		}
		if fit.Iterations > 50 {
			b = last + (b-last)/2 // half steps end the swing to and fro that very uncertain points can set off
		}
		settled = math.Abs(b-last) <= 4*epsilon*max(math.Abs(b), math.Abs(last)) || b == 0 && last == 0 ||
			fit.Iterations > 20 && math.Abs(b-last) <= 64*epsilon*(1+math.Abs(b))
	}
	ps.finish(&fit, b, f)
	return fit, nil
}

// linePoint is one point, shifted and scaled.
type linePoint struct{ x, y, vx, vy, c, w, beta float64 }

// points are those of a line, with the weighted means of the last weigh.
type points struct {
	p      []linePoint
	sum    float64 // of the weights
	mx, my float64
	b      float64
	unit   float64 // what the points' uncertainties were divided by
}

// weigh sets the weights and the rest for the slope b; it gives the first point whose weight is infinite, or -1.
func (ps *points) weigh(b float64) int {
	ps.b, ps.sum, ps.mx, ps.my = b, 0, 0, 0
	for i := range ps.p {
		p := &ps.p[i]
		p.w = 1 / (p.vy + b*b*p.vx - 2*b*p.c)
		if !(p.w > 0 && finite(p.w)) {
			return i
		}
		ps.sum += p.w
		ps.mx += p.w * p.x
		ps.my += p.w * p.y
	}
	ps.mx /= ps.sum
	ps.my /= ps.sum
	for i := range ps.p {
		p := &ps.p[i]
		u, v := p.x-ps.mx, p.y-ps.my
		p.beta = p.w * (u*p.vy + b*v*p.vx - (b*u+v)*p.c)
	}
	return -1
}

func (ps *points) slope() float64 {
	var num, den float64
	for _, p := range ps.p {
		num += p.w * p.beta * (p.y - ps.my)
		den += p.w * p.beta * (p.x - ps.mx)
	}
	return num / den
}

// ordinary is the slope of ordinary least squares, to start from.
func (ps *points) ordinary() float64 {
	var mx, my, num, den float64
	n := float64(len(ps.p))
	for _, p := range ps.p {
		mx += p.x / n
		my += p.y / n
	}
	for _, p := range ps.p {
		num += (p.x - mx) * (p.y - my)
		den += (p.x - mx) * (p.x - mx)
	}
	return num / den
}

// finish writes the line of slope b into fit, in the caller's units.
func (ps *points) finish(fit *LineFit, b float64, f frame) {
	ps.weigh(b)
	a := ps.my - b*ps.mx
	var mean float64
	for _, p := range ps.p {
		mean += p.w * (ps.mx + p.beta)
		d := p.y - a - b*p.x
		fit.Chi2 += p.w * (d / ps.unit) * (d / ps.unit)
		fit.X = append(fit.X, f.x0+f.x*(ps.mx+p.beta))
		fit.Y = append(fit.Y, f.y0+f.y*(ps.my+b*p.beta))
	}
	mean /= ps.sum
	var spread float64
	for _, p := range ps.p {
		d := ps.mx + p.beta - mean
		spread += p.w * d * d
	}
	// Uncertainties times their own unit, then times the frame's.
	ub := ps.unit / math.Sqrt(spread)
	fit.Slope = b * f.y / f.x
	fit.Intercept = f.y0 + (a*f.y - fit.Slope*f.x0)
	fit.USlope = ub * f.y / f.x
	at := f.x0 + mean*f.x // the mean of the adjusted abscissas
	fit.UIntercept = math.Hypot(ps.unit/math.Sqrt(ps.sum)*f.y, at*fit.USlope)
	fit.Cov = -at * fit.USlope * fit.USlope
}
