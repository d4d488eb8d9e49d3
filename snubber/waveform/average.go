package waveform

import (
	"fmt"
	"math"
)

const (
	// fewestAligned is the overlap that captures need, in samples.
	fewestAligned = 64
	// leastCorrelation is how alike two captures of one edge must be (Pearson's coefficient, once aligned).
	leastCorrelation = 0.7
)

// Average is the mean of captures of one edge, each shifted to the first by a fraction of a sample. Noise that the captures do
// not share falls by the square root of their number, and a few per cent more near half the sampling rate; so does a
// converter's rounding where noise of half a step or more dithers it.
//
// The captures have one interval (to within 1e-6); starts and lengths may differ. The times are the first record's, cut to
// the samples that all have, less 16 at either end for the interpolation. A shift is found by correlation over at least half
// of the shorter record and then refined by least squares (see refiner); with white noise its scatter is 1 to 1.3 times the
// Cramer-Rao bound of two noisy records, sqrt(2) sigma / sqrt(sum of slopes squared). A scatter of s seconds lowers what is
// seen at frequency f by (2 pi f s)^2 / 2: with 20 samples per cycle and noise of 5 % of the step, some 2e-4. The
// interpolation changes what has 3 samples per cycle or more by less than 1e-5.
//
// It is an error, which names the capture by its place from 1 and its origin, where one is not of the same edge: its
// correlation with the first is below 0.7, or its swing (the standard deviation) not between half and twice as large.
func Average(records []Record) (Record, error) {
	if len(records) == 0 {
		return Record{}, fmt.Errorf("averaging captures: there are none")
	}
	first := records[0]
	for i, r := range records {
		if err := r.Check(); err != nil {
			return Record{}, fmt.Errorf("averaging %s: %w", captureName(records, i), err)
		}
		if !(math.Abs(r.Interval/first.Interval-1) <= 1e-6) {
			return Record{}, fmt.Errorf("averaging %s: its interval is %g s and the first's %g s; take all captures at one sampling rate", captureName(records, i), r.Interval, first.Interval)
		}
		if len(r.Volts) < fewestAligned {
			return Record{}, fmt.Errorf("averaging %s: it has %d samples; to align captures takes %d or more", captureName(records, i), len(r.Volts), fewestAligned)
		}
	}
	shifts := make([]float64, len(records))
	longest := 0
	for _, r := range records {
		longest = max(longest, len(r.Volts))
	}
	if peakOf(first.Volts) == 0 && len(records) > 1 {
		return Record{}, fmt.Errorf("averaging %s: it has no edge: every sample is 0 V", captureName(records, 0))
	}
	find := newCorrelator(first.Volts, longest)
	fine := newRefiner(first.Volts)
	for i, r := range records[1:] {
		shift := fine.shift(r.Volts, float64(find.lag(r.Volts)))
		if why := sameEdge(first.Volts, r.Volts, shift); why != "" {
			return Record{}, fmt.Errorf("averaging %s: %s; leave it out, or trigger all captures on one edge", captureName(records, i+1), why)
		}
		shifts[i+1] = shift
	}
	mean, from, err := shiftedMean(records, shifts)
	if err != nil {
		return Record{}, err
	}
	return Record{
		Start:    first.TimeAt(from),
		Interval: first.Interval,
		Volts:    mean,
		Origin:   averageOrigin(records),
	}, nil
}

func captureName(records []Record, i int) string {
	name := fmt.Sprintf("capture %d of %d", i+1, len(records))
	if records[i].Origin != "" {
		name += " (" + records[i].Origin + ")"
	}
	return name
}

func averageOrigin(records []Record) string {
	switch {
	case len(records) == 1:
		return records[0].Origin
	case records[0].Origin == "":
		return fmt.Sprintf("the mean of %d captures", len(records))
	}
	return fmt.Sprintf("the mean of %d captures, the first %s", len(records), records[0].Origin)
}

// shiftedMean is the mean of the records, record i read at sample k + shifts[i] for the mean's sample k. It begins at sample
// from of the first record and holds what all have.
func shiftedMean(records []Record, shifts []float64) (mean []float64, from int, err error) {
	to := math.MaxInt
	for i, r := range records {
		whole := int(math.Floor(shifts[i]))
		from = max(from, shiftTaps/2-1-whole)
		to = min(to, len(r.Volts)-shiftTaps/2-whole)
	}
	if to-from < fewestAligned/2 {
		return nil, 0, fmt.Errorf("averaging %d captures: they have only %d samples in common once their edges are aligned; take longer ones, or trigger them on the edge", len(records), max(0, to-from))
	}
	mean = make([]float64, to-from)
	for i, r := range records {
		addShifted(mean, r.Volts, float64(from)+shifts[i], 1/float64(len(records)))
	}
	return mean, from, nil
}

// sameEdge says why v, read at k + shift, is not the edge that ref is; "" when it is.
func sameEdge(ref, v []float64, shift float64) string {
	lag := int(math.Round(shift))
	a, b := overlap(ref, v, lag)
	r, sa, sb := pearson(a, b)
	switch {
	case sa == 0:
		return "the first capture has no edge: where both overlap, its voltage is constant"
	case sb == 0:
		return "it has no edge: its voltage is constant"
	case !(r >= leastCorrelation):
		return fmt.Sprintf("it is not of the first's edge: their correlation is %.2f and should be %.1f or more", r, leastCorrelation)
	case !(sb <= 2*sa && sa <= 2*sb):
		return fmt.Sprintf("its swing is %.3g times the first's, where twice or half is the most", sb/sa)
	}
	return ""
}

// overlap is the part of a and of v that stand beside each other when sample k of a is sample k + lag of v.
func overlap(a, v []float64, lag int) ([]float64, []float64) {
	from, to := max(0, -lag), min(len(a), len(v)-lag)
	if from >= to {
		return nil, nil
	}
	return a[from:to], v[from+lag : to+lag]
}

// pearson is the correlation coefficient and the standard deviations.
func pearson(a, b []float64) (r, sa, sb float64) {
	ma, mb := meanOf(a), meanOf(b)
	scale := max(peakOf(a), peakOf(b))
	if scale == 0 || len(a) == 0 {
		return 0, 0, 0
	}
	var aa, bb, ab float64
	for i := range a {
		x, y := (a[i]-ma)/scale, (b[i]-mb)/scale
		aa, bb, ab = aa+x*x, bb+y*y, ab+x*y
	}
	n := float64(len(a))
	return ab / math.Sqrt(aa*bb), scale * math.Sqrt(aa/n), scale * math.Sqrt(bb/n)
}
