package waveform

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/dsp/fourier"
)

// correlator looks for ref in other records.
type correlator struct {
	fft         *fourier.FFT
	mean, scale float64 // taken off samples, and divided by, to keep the sums small
	conjugate   []complex128
	sum, square []float64 // of ref, running
	length      int       // of ref
	padded      []float64
	products    []complex128
}

// newCorrelator is for records of up to longest samples; ref is not all zeros.
func newCorrelator(ref []float64, longest int) *correlator {
	n := fastLength(len(ref) + longest)
	c := &correlator{
		fft:    fourier.NewFFT(n),
		mean:   meanOf(ref),
		scale:  2 * peakOf(ref),
		length: len(ref),
		padded: make([]float64, n),
	}
	c.sum, c.square = running(c.fill(ref))
	c.conjugate = c.fft.Coefficients(nil, c.padded)
	for k, x := range c.conjugate {
		c.conjugate[k] = complex(real(x), -imag(x))
	}
	c.products = make([]complex128, len(c.conjugate))
	return c
}

func (c *correlator) fill(v []float64) []float64 {
	for i, x := range v {
		c.padded[i] = x/c.scale - c.mean/c.scale
	}
	clear(c.padded[len(v):])
	return c.padded[:len(v)]
}

// lag is the whole number of samples at which v looks most like ref: sample k of ref beside sample k + lag of v. Every lag that
// leaves half of the shorter record overlapping is tried; the correlation coefficient is that of the overlap alone, so that a
// step does not draw the lag to 0.
func (c *correlator) lag(v []float64) int {
	sum, square := running(c.fill(v))
	c.fft.Coefficients(c.products, c.padded)
	for k, x := range c.conjugate {
		c.products[k] *= x
	}
	n := len(c.padded)
	c.fft.Sequence(c.padded, c.products) // sample lag mod n over n is the sum of ref[k] v[k + lag]
	least := min(c.length, len(v)) / 2
	best, top := 0, math.Inf(-1)
	for lag := least - c.length; lag <= len(v)-least; lag++ {
		from, to := max(0, -lag), min(c.length, len(v)-lag)
		m := float64(to - from)
		ma, mb := (c.sum[to]-c.sum[from])/m, (sum[to+lag]-sum[from+lag])/m
		va := (c.square[to]-c.square[from])/m - ma*ma
		vb := (square[to+lag]-square[from+lag])/m - mb*mb
		cov := c.padded[(lag+n)%n]/float64(n)/m - ma*mb
		if va > 1e-12 && vb > 1e-12 {
			if r := cov / math.Sqrt(va*vb); r > top {
				best, top = lag, r
			}
		}
	}
	return best
}

// running sums of v and of its squares: up to and without each sample.
func running(v []float64) (sums, squares []float64) {
	sums, squares = make([]float64, len(v)+1), make([]float64, len(v)+1)
	for i, x := range v {
		sums[i+1] = sums[i] + x
		squares[i+1] = squares[i] + x*x
	}
	return sums, squares
}

// refiner improves shifts against ref.
type refiner struct {
	ref         []float64
	from        int // the sample of ref that rise and slope begin at
	rise, slope []float64
	at          []float64
}

func newRefiner(ref []float64) *refiner {
	f := &refiner{ref: ref}
	f.from, f.rise, f.slope = steepPart(ref)
	f.at = make([]float64, len(f.rise))
	return f
}

// shift improves a shift, in samples, at which v looks like ref, by least squares:
//
//	minimise the sum over k of (v(k + shift) - ref(k) - offset)^2
//
// by Gauss-Newton with the slope of ref in place of that of v, which stays the same (S. Baker and I. Matthews, Lucas-Kanade 20
// Years On, Int. J. Comput. Vis. 56, 221 (2004), the inverse compositional form; attribution from memory). Samples count
// where the slope of ref stands out of its noise: elsewhere they only add theirs.
func (f *refiner) shift(v []float64, shift float64) float64 {
	start := shift
	for range 40 {
		// Where v does not reach, the slope does not count.
		whole := int(math.Floor(shift))
		lo := max(0, shiftTaps/2-1-whole-f.from)
		hi := min(len(f.at), len(v)-shiftTaps/2-whole-f.from)
		if hi-lo < fewestAligned/4 {
			return start
		}
		part := f.at[lo:hi]
		clear(part)
		addShifted(part, v, float64(f.from+lo)+shift, 1)
		for i := range part {
			part[i] -= f.ref[f.from+lo+i]
		}
		mean := meanOf(f.rise[lo:hi])
		var along, off float64
		for i := range part {
			along += (f.rise[lo+i] - mean) * f.slope[lo+i]
			off += (f.rise[lo+i] - mean) * part[i]
		}
		step := -off / along
		if !(math.Abs(step) <= math.MaxFloat64) {
			return start
		}
		shift += max(-1, min(1, step))
		if math.Abs(shift-start) > 20 {
			return start // it ran away: sameEdge judges the start
		}
		if math.Abs(step) < 1e-5 {
			break
		}
	}
	return shift
}

// steepPart is where v rises or falls, and there, per sample, its rise over as few samples as let it stand out of the noise, and
// its slope. v has fewestAligned samples or more.
func steepPart(v []float64) (from int, rise, slope []float64) {
	sigma := noiseOf(v)
	reach, steepest, top := 1, 0, 0.0
	for ; ; reach *= 2 {
		top = 0
		for i := reach; i < len(v)-reach; i++ {
			if d := math.Abs(v[i+reach] - v[i-reach]); d > top {
				steepest, top = i, d
			}
		}
		if top > 10*math.Sqrt2*sigma || reach > len(v)/16 {
			break
		}
	}
	// The highest of n draws of noise is some sqrt(2 ln n) standard deviations up.
	limit := max(top/20, (1+math.Sqrt(2*math.Log(float64(len(v)))))*math.Sqrt2*sigma)
	least, most := steepest, steepest
	for i := reach; i < len(v)-reach; i++ {
		if math.Abs(v[i+reach]-v[i-reach]) >= limit {
			least, most = min(least, i), max(most, i)
		}
	}
	edge := max(2, reach)
	from = max(edge, least-shiftTaps/2)
	to := min(len(v)-edge, most+shiftTaps/2)
	rise, slope = make([]float64, to-from), make([]float64, to-from)
	for i := range rise {
		k := from + i
		rise[i] = (v[k+reach] - v[k-reach]) / float64(2*reach)
		slope[i] = (8*(v[k+1]-v[k-1]) - (v[k+2] - v[k-2])) / 12 // central difference of fourth order
	}
	return from, rise, slope
}

// noiseOf is the standard deviation of white noise in v, from the median of second differences, which what is smooth hardly
// moves.
func noiseOf(v []float64) float64 {
	stride := max(1, len(v)/4096)
	var second []float64
	for i := 1; i < len(v)-1; i += stride {
		second = append(second, math.Abs(v[i-1]-2*v[i]+v[i+1]))
	}
	slices.Sort(second)
	return second[len(second)/2] / 0.6745 / math.Sqrt(6)
}
