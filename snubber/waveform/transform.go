package waveform

import (
	"math"
	"math/bits"
	"math/cmplx"

	"gonum.org/v1/gonum/dsp/fourier"
)

// fastLength is the least length, n or more, without a prime factor above 5: gonum's transform takes time in proportion to
// the largest prime factor. Above 2^17 it is also a multiple of 16, for magnitudes.
func fastLength(n int) int {
	multiple := 1
	if n > splitAbove {
		multiple = 2 * splitInto
	}
	best := multiple << bits.Len(uint((n-1)/multiple))
	for five := multiple; five < best; five *= 5 {
		for three := five; three < best; three *= 3 {
			two := three
			if two < n {
				two <<= bits.Len(uint((n - 1) / two))
			}
			best = min(best, two)
		}
	}
	return best
}

const (
	splitInto  = 8
	splitAbove = 1 << 17
)

// magnitudes of the discrete Fourier transform of length samples, at its lines 0 to length/2. length is a fastLength.
//
// A long one is taken as eight interleaved ones and joined line by line (decimation in time: J. W. Cooley and J. W. Tukey, Math.
// Comp. 19, 297 (1965), attribution from memory): one transform needs working space of five times the samples, these
// need it of twice.
func magnitudes(length int, at func(i int) float64) []float64 {
	out := make([]float64, length/2+1)
	parts := 1
	if length > splitAbove && length%(2*splitInto) == 0 {
		parts = splitInto
	}
	m := length / parts
	fft := fourier.NewFFT(m)
	samples := make([]float64, m)
	halves := make([][]complex128, parts)
	for p := range halves {
		for i := range samples {
			samples[i] = at(i*parts + p)
		}
		halves[p] = fft.Coefficients(nil, samples)
	}
	for k := range out {
		// Line k of part p is line k mod m of its transform, whose upper half mirrors the lower.
		j, mirrored := k%m, false
		if 2*j > m {
			j, mirrored = m-j, true
		}
		angle := -2 * math.Pi * float64(k) / float64(length)
		turn, w := cmplx.Rect(1, angle), complex(1, 0)
		var sum complex128
		for p := range halves {
			x := halves[p][j]
			if mirrored {
				x = cmplx.Conj(x)
			}
			sum += w * x
			w *= turn
		}
		out[k] = cmplx.Abs(sum)
	}
	return out
}
