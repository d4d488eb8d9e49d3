package waveform

import "math"

// shiftTaps is how many samples are weighed for one between them.
const shiftTaps = 32

// shiftWeights are the weights of samples -15 to 16 for the value at 0 <= fraction < 1: a sine cardinal under a Kaiser window (J. F.
// Kaiser, in F. F. Kuo and J. F. Kaiser, System Analysis by Digital Computer, 1966; attribution from memory) of parameter 11,
// made to add up to 1. What has 3 samples per cycle or more comes through within 1e-5 of its amplitude. A step within one sample, which no sampling theorem covers, rings at half the sampling rate for 16 samples.
func shiftWeights(fraction float64) (w [shiftTaps]float64) {
	const half, beta = shiftTaps / 2, 11
	sum := 0.0
	for i := range w {
		x := float64(i-half+1) - fraction
		u := x / half
		w[i] = besselI0(beta * math.Sqrt(max(0, 1-u*u)))
		if x != 0 {
			w[i] *= math.Sin(math.Pi*x) / (math.Pi * x)
		}
		sum += w[i]
	}
	for i := range w {
		w[i] /= sum
	}
	return w
}

// besselI0 is the modified Bessel function of the first kind of order 0, by its power series: Abramowitz and Stegun 9.6.12.
func besselI0(x float64) float64 {
	sum, term := 1.0, 1.0
	for k := 1.0; term > 1e-17*sum; k++ {
		term *= x / (2 * k) * (x / (2 * k))
		sum += term
	}
	return sum
}

// addShifted adds times v(k + shift) to dst[k]. v must reach 15 samples before the first of these and 16 after the last.
func addShifted(dst, v []float64, shift, times float64) {
	whole := math.Floor(shift)
	w := shiftWeights(shift - whole)
	from := int(whole) - shiftTaps/2 + 1
	for k := range dst {
		near := v[from+k:][:shiftTaps]
		sum := 0.0
		for i, x := range near {
			sum += w[i] * x
		}
		dst[k] += times * sum
	}
}
