package simbench

import "math"

// Figures is what the scope makes of a capture. NaN stands for what cannot be told.
type Figures struct {
	RingHz   float64 // Hz: the ring's frequency as seen
	DecayS   float64 // s: 1/e time of its envelope
	PeakV    float64 // V: the highest voltage; +Inf where the converter was overdriven
	SettledV float64 // V: where the record ends
}

// fewestCrossings is how many crossings of the settled level, the edge's own not counted, make a ring: one
// and a half cycles.
const fewestCrossings = 4

// Evaluate reads the figures from the samples. The samples are first smoothed by a running parabola (Savitzky
// and Golay, Anal. Chem. 36, 1627, 1964); the frequency is the weighted straight line through the
// crossings of the settled level, the decay that through the logarithm of the swing from the middle of each
// half wave to that of the next. Middles between crossings stand at one phase of the ring, and noise does not
// lift them as it lifts extremes; in their differences neither the level nor the asymmetry of the waves enters.
func (c Capture) Evaluate() Figures {
	v := smooth(c.Volts())
	f := Figures{RingHz: math.NaN(), DecayS: math.NaN(), PeakV: math.Inf(-1)}
	for _, x := range v {
		f.PeakV = max(f.PeakV, x)
	}
	var noise float64
	f.SettledV, noise = tail(v)
	if c.Clipped() {
		f.PeakV = math.Inf(1)
		return f
	}
	// The swings that count stand well out of the noise and of the steps of the converter.
	swings := ring(v, f.SettledV, max(6*noise, 1.5*c.VoltsPerBit))
	if len(swings) < fewestCrossings {
		return f
	}
	var time, envelope line
	for i, s := range swings {
		time.add(float64(i), s.begin, s.size*s.size)
		if i > 0 {
			if whole := s.size + swings[i-1].size; whole > 0 {
				envelope.add(s.begin, math.Log(whole), whole*whole)
			}
		}
	}
	if d := -envelope.slope() / c.StepS; d > 0 && time.slope() > 0 {
		f.RingHz = 1 / (2 * time.slope() * c.StepS)
		f.DecayS = 1 / d
	}
	return f
}

// swing is one half wave about the settled level.
type swing struct {
	begin, end float64 // in samples: the crossings that bound it
	size       float64 // V: how far its middle is from the level, on the half wave's own side
}

// ring lists the half waves after the edge's own overshoot, for as long as they exceed the threshold and
// follow one another evenly: where one is missing the ring is over, and what comes later is noise. The
// level counts as crossed only once it is left by the threshold.
func ring(v []float64, level, threshold float64) (list []swing) {
	i := 0
	for i < len(v) && v[i] <= level+threshold {
		i++
	}
	var (
		side  = 1.0  // +1 above the level, -1 below
		begin = -1.0 // where the half wave being followed began; -1: the edge's
		zero  float64
		out   bool // the level has been crossed at zero, but not yet left by the threshold
	)
	for ; i < len(v); i++ {
		x := side * (v[i] - level)
		switch {
		case x >= 0:
			out = false
		case !out:
			before := side * (v[i-1] - level)
			zero, out = float64(i)+x/(before-x), true
		}
		if x > -threshold {
			continue
		}
		if begin >= 0 {
			if n := len(list); n > 0 && zero-begin > 1.5*(begin-list[0].begin)/float64(n) {
				return list
			}
			middle, part := math.Modf((begin + zero) / 2)
			at := v[int(middle)] + part*(v[int(middle)+1]-v[int(middle)])
			list = append(list, swing{begin: begin, end: zero, size: side * (at - level)})
		}
		begin, side, out = zero, -side, false
	}
	return list
}

// smooth replaces each sample by the middle of the least-squares parabola through the nine around it.
func smooth(v []float64) []float64 {
	weights := [9]float64{-21, 14, 39, 54, 59, 54, 39, 14, -21} // over 231
	out := make([]float64, len(v))
	copy(out, v)
	for i := 4; i+4 < len(v); i++ {
		sum := 0.0
		for k, w := range weights {
			sum += w * v[i+k-4]
		}
		out[i] = sum / 231
	}
	return out
}

// tail is the mean of the record's last fifth and the scatter about it, V rms.
func tail(v []float64) (mean, scatter float64) {
	last := v[len(v)-len(v)/5:]
	for _, x := range last {
		mean += x / float64(len(last))
	}
	for _, x := range last {
		scatter += (x - mean) * (x - mean) / float64(len(last))
	}
	return mean, math.Sqrt(scatter)
}

// line is a weighted least-squares straight line, gathered point by point.
type line struct {
	w, x, y, xx, xy float64
}

func (l *line) add(x, y, w float64) {
	// West's update (Comm. ACM 22, 532, 1979) keeps the digits that sums of squares would lose.
	l.w += w
	dx, dy := x-l.x, y-l.y
	l.x += dx * w / l.w
	l.y += dy * w / l.w
	l.xx += w * dx * (x - l.x)
	l.xy += w * dx * (y - l.y)
}

func (l *line) slope() float64 { return l.xy / l.xx }
