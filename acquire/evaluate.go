package acquire

import "math"

// evaluate gives the mean of the repeats and its standard uncertainty, both in the quantity's unit.
//
//	mean = sum(x)/n
//	u    = sqrt(s^2/n + a^2/3),   s^2 = sum((x - mean)^2)/(n-1),   a = percent of mean + fixed
//
// JCGM 100:2008 (GUM), 4.2.1 to 4.2.3 for the repeats, 4.3.7 for the bound a, 5.1.2 for their sum. One
// repeat has no s: u is then a/sqrt(3). A u of 0 means that neither is known.
func (q Query) evaluate(values []float64) (mean, u float64) {
	n := float64(len(values))
	for _, x := range values {
		mean += (x - values[0]) / n // from the first, so that equal repeats have a spread of exactly zero
	}
	mean += values[0]
	var squares float64
	for _, x := range values {
		squares += (x - mean) * (x - mean)
	}
	var variance float64
	if n > 1 {
		variance = squares / (n - 1) / n
	}
	a := q.Accuracy.Bound(mean)
	return mean, math.Sqrt(variance + a*a/3)
}
