package waveform

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// evenTo is how even the sampling must be: the part of the mean step by which a step may differ from it.
const evenTo = 0.01

// timeline judges the times of a file as they pass, without holding them.
type timeline struct {
	n           int
	first, last float64
	digits      int     // the most significant digits a time is written with
	longest     float64 // s: the largest time, sign apart, written with so many
	least, most timeStep
	marks       []timeMark // every stride-th time: at most maxMarks
	stride      int
}

const maxMarks = 2048

type timeStep struct {
	from, to float64
	line     int // of the time to
}

func (s timeStep) size() float64 { return s.to - s.from }

type timeMark struct {
	t    float64
	line int
}

func (l *timeline) add(t float64, digits, line int) error {
	step := timeStep{l.last, t, line}
	switch {
	case l.n == 0:
		l.first, l.stride = t, 1
	case !(t > l.last):
		return fmt.Errorf("line %d, column 1 (time): %g s comes after %g s: times must rise; print them with more digits if rounding made them equal", line, t, l.last)
	case l.n == 1:
		l.least, l.most = step, step
	case step.size() < l.least.size():
		l.least = step
	case step.size() > l.most.size():
		l.most = step
	}
	if l.n%l.stride == 0 {
		if len(l.marks) == maxMarks {
			for i := range l.marks[:maxMarks/2] {
				l.marks[i] = l.marks[2*i]
			}
			l.marks = l.marks[:maxMarks/2]
			l.stride *= 2
		}
		l.marks = append(l.marks, timeMark{t, line})
	}
	l.last = t
	if size := math.Abs(t); digits > l.digits || digits == l.digits && size > l.longest {
		l.digits, l.longest = digits, size
	}
	l.n++
	return nil
}

// interval is the step of the even grid the times stand on, or what keeps them from being one. n is at least 2.
func (l *timeline) interval() (float64, error) {
	mean := (l.last - l.first) / float64(l.n-1)
	if !(mean > 0) || math.IsInf(mean, 0) {
		return 0, fmt.Errorf("has times from %g s to %g s: no interval between samples can be told from them", l.first, l.last)
	}
	unit, float := l.lastPlace()
	allowed := float
	if unit <= mean/4 {
		allowed += unit
	}
	for _, s := range [...]timeStep{l.most, l.least} {
		if math.Abs(s.size()-mean) > evenTo*mean+allowed {
			return 0, uneven(s, mean, unit)
		}
	}
	// A step that grows slowly hides behind the rounding of each: longer runs show it.
	for run := 1; run < len(l.marks); run *= 2 {
		want := float64(run*l.stride) * mean
		for i := run; i < len(l.marks); i++ {
			a, b := l.marks[i-run], l.marks[i]
			if math.Abs(b.t-a.t-want) > evenTo*want+allowed {
				return 0, fmt.Errorf("line %d to line %d: the mean step is %.4g s, in all of the record it is %.4g s: sampling must be even to within 1 %%; sample the record again at one rate",
					a.line, b.line, (b.t-a.t)/float64(run*l.stride), mean)
			}
		}
	}
	// Few samples with few digits leave much open: what is printed is then the better guess than a rounder number.
	return fewestDigits(mean, min(max(unit, float)/float64(l.n-1), 1e-3*mean)), nil
}

// lastPlace is one unit of the last place printed, and at most two of a float64's last place at the largest of the times.
func (l *timeline) lastPlace() (unit, float float64) {
	_, power, _ := strings.Cut(strconv.FormatFloat(l.longest, 'e', -1, 64), "e")
	n, _ := strconv.Atoi(power)
	return math.Pow10(n + 1 - l.digits), max(math.Abs(l.first), math.Abs(l.last)) * 0x1p-52
}

// fewestDigits is the decimal of fewest digits within the given distance of v.
func fewestDigits(v, within float64) float64 {
	for digits := range 17 {
		short, err := strconv.ParseFloat(strconv.FormatFloat(v, 'e', digits, 64), 64)
		if err == nil && short > 0 && math.Abs(short-v) <= within {
			return short
		}
	}
	return v
}

func uneven(s timeStep, mean, unit float64) error {
	cure := "sample the record again at even steps"
	switch {
	case s.size() > 1.5*mean:
		cure = "samples are missing; export the record again, or cut it there"
	case s.size() < 0.6*mean:
		cure = "a sample too many stands there; export the record again, or delete it"
	case unit > evenTo*mean:
		cure = "print the times with more digits, or sample at even steps"
	}
	return fmt.Errorf("line %d, column 1 (time): a step of %.4g s, from %g s to %g s, where the mean step is %.4g s: sampling must be even to within 1 %%; %s",
		s.line, s.size(), s.from, s.to, mean, cure)
}
