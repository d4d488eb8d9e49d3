package leastsq

// Status says how a fit ended.
type Status int

// The ways a fit ends. Only after Converged are the parameters and their uncertainties to be relied on.
const (
	Converged      Status = iota // at a minimum
	Singular                     // at a minimum, but the readings cannot tell a combination of parameters: see Result.Blind
	Stalled                      // no step lowers chi2 though the gradient is not zero: a wrong Jacobian, or a model that is not smooth
	IterationLimit               // MaxIterations reached
	Stopped                      // the context ended
	NonFinite                    // the Jacobian at the best parameters is not finite
)

func (s Status) String() string {
	switch s {
	case Converged:
		return "converged"
	case Singular:
		return "singular"
	case Stalled:
		return "stalled"
	case IterationLimit:
		return "iteration limit"
	case Stopped:
		return "stopped"
	case NonFinite:
		return "not finite"
	}
	return "unknown"
}
