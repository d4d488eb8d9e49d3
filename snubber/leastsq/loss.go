package leastsq

import "math"

// Loss is a robust loss: of the square s = r^2 of a whitened residual it gives rho(s), which takes the place of s
// in the sum to be minimised, and its derivative. rho(0) = 0, rho' (0) = 1, 0 <= rho' <= 1, or the
// uncertainties lose their meaning.
//
// The iteration weights each residual by sqrt(rho'(r^2)), renewed at each step (iteratively reweighted
// least squares; the first-order form of Triggs, McLauchlan, Hartley and Fitzgibbon, "Bundle adjustment
// - a modern synthesis", 2000, section 4.3, cited from memory). The covariance is that of the weighted
// residuals at the end, an approximation.
type Loss func(s float64) (rho, slope float64)

// Huber is the loss of Huber, "Robust estimation of a location parameter", Ann. Math. Stat. 35, 73 (1964):
// r^2 up to |r| = k, then 2 k |r| - k^2. k is in standard uncertainties, > 0; 1.345 keeps 95 % of the
// efficiency on normal errors.
func Huber(k float64) Loss {
	return func(s float64) (float64, float64) {
		if s <= k*k {
			return s, 1
		}
		r := math.Sqrt(s)
		return 2*k*r - k*k, k / r
	}
}

// Cauchy is the loss k^2 ln(1 + (r/k)^2), under which a far outlier hardly pulls. k is in standard
// uncertainties, > 0; 2.385 keeps 95 % of the efficiency on normal errors (common practice).
func Cauchy(k float64) Loss {
	return func(s float64) (float64, float64) {
		x := s / (k * k)
		return k * k * math.Log1p(x), 1 / (1 + x)
	}
}
