// Package leastsq fits parameters to readings by weighted least squares: nonlinear models by the
// Levenberg-Marquardt method (Fit), linear ones by an orthogonal factorisation (Linear), the straight
// line with uncertainties in both coordinates (Line), and the propagation of a covariance through a
// function's derivatives (Propagate).
//
// It is not a general optimiser: there is one minimum, the one downhill from the start, and no search for
// others. Bounds are kept by transforming the parameters, not by active sets.
//
// Fit and Linear go through an orthogonal factorisation of the Jacobian (QR with column pivoting in the
// iteration, the singular values of its R for rank and covariance). They never form the normal equations, which
// square the condition number.
//
// A fit that ends without an answer to trust says so in its Status; an error means there is no answer at
// all. Uncertainties are standard uncertainties (k = 1). Units are the caller's: nothing here depends on
// their size, as long as squares of the values stay within a float64.
//
// Methods:
//
//	Levenberg, "A method for the solution of certain non-linear problems in least squares",
//	    Quart. Appl. Math. 2, 164 (1944)
//	Marquardt, "An algorithm for least-squares estimation of nonlinear parameters",
//	    J. SIAM 11, 431 (1963)
//	More, "The Levenberg-Marquardt algorithm: implementation and theory", Numerical
//	    Analysis (ed. Watson), Springer, 105 (1978): the scaling of the parameters
//	Nielsen, "Damping parameter in Marquardt's method", report IMM-REP-1999-05, Technical University
//	    of Denmark (1999): the damping from the gain ratio
//	Transtrum and Sethna, "Improvements to the Levenberg-Marquardt algorithm for nonlinear
//	    least-squares minimization", arXiv:1201.5885 (2012): the geodesic acceleration, which also
//	    shortens steps that leave the region where the linearised model means anything
//	Bates and Watts, "A relative offset orthogonality convergence criterion for nonlinear least
//	    squares", Technometrics 23, 179 (1981)
//
// The titles above are cited from memory; the code is checked against certified results, not against them.
package leastsq
