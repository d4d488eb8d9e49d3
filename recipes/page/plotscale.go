package page

import (
	"math"
	"strconv"

	"ringbook/snubber/quantity"
)

// tick is a mark on an axis; one without label is minor.
type tick struct {
	at    float64 // 0 to 1 along the axis
	label string
}

// ruler places the values of an axis along its length.
type ruler struct {
	axis      Axis
	low, high float64 // of the value, or of its decadic logarithm
	symbol    string  // the unit shown, with its prefix
	ticks     []tick
	empty     bool
}

// at is where v lies: 0 at the beginning of the axis, 1 at its end. A value that cannot be shown gives NaN.
func (r *ruler) at(v float64) float64 {
	if !plottable(v) {
		return math.NaN()
	}
	if r.axis.scale == logarithmic {
		v = math.Log10(v)
	}
	return (v - r.low) / (r.high - r.low)
}

// measure is how much of the axis a label takes, with the room around it, as a fraction.
type measure func(label string) float64

// newRuler fits an axis around what it must show and marks round values on it, as many as there is room for.
func newRuler(a Axis, r reach, room measure) *ruler {
	u := &ruler{axis: a, empty: !r.any}
	switch {
	case a.scale == category:
		u.categories(room)
		return u
	case u.empty:
		u.low, u.high = 0, 1
		_, u.symbol = a.shown(0)
		return u
	}
	low, high := r.low, r.high
	if a.scale == logarithmic {
		low, high = math.Log10(low), math.Log10(high)
	}
	u.low, u.high = widen(low, high, a.scale, r.pad)
	if a.scale == logarithmic {
		u.logTicks(room)
	} else {
		u.linearTicks(room)
	}
	return u
}

// widen keeps the ends of an axis apart and the data off its ends.
func widen(low, high float64, s axisScale, pad bool) (float64, float64) {
	span := high - low
	switch most := math.Max(math.Abs(low), math.Abs(high)); {
	case s == logarithmic && span < 1e-3:
		return low - 0.2, high + 0.2
	case s == linear && most < 1e-250:
		return -1, 1
	case s == linear && span <= 1e-9*most: // all equal, as far as one could tell
		return low - 0.1*most, high + 0.1*most
	}
	if pad {
		return low - 0.05*span, high + 0.05*span
	}
	return low, high
}

// shown is the factor and the unit an axis is shown in when its largest value is v.
func (a Axis) shown(v float64) (factor float64, symbol string) {
	factor, symbol = 1, a.symbol
	switch {
	case a.factor != 0:
		factor = a.factor
	case a.unit == quantity.Ratio || a.unit == quantity.Temperature:
		symbol = a.unit.Symbol()
	default:
		var prefix string
		factor, prefix = quantity.Scale(v)
		symbol = prefix + a.unit.Symbol()
	}
	// Beyond the prefixes a power of ten goes into the label.
	if w := math.Abs(v * factor); w > 0 && (w < 1e-3 || w >= 1e6) {
		e := 3 * int(math.Floor(math.Log10(w)/3))
		factor *= math.Pow10(-e)
		if symbol != "" {
			symbol = "\u00a0" + symbol
		}
		symbol = "1e" + strconv.Itoa(e) + symbol
	}
	return factor, symbol
}

// linearTicks marks multiples of 1, 2 or 5 times a power of ten in the unit shown.
func (r *ruler) linearTicks(room measure) {
	factor, symbol := r.axis.shown(math.Max(math.Abs(r.low), math.Abs(r.high)))
	r.symbol = symbol
	low, high := r.low*factor, r.high*factor
	for e := int(math.Floor(math.Log10(high-low))) - 2; ; e++ {
		for _, m := range []int{1, 2, 5} {
			if r.ticks = multiples(low, high, m, e); r.fits(r.ticks, room) {
				for i := range r.ticks {
					r.ticks[i].at = r.at(r.ticks[i].at / factor)
				}
				return
			}
		}
	}
}

// multiples are the ticks at whole multiples of m times ten to the power e from low to high, at their shown values.
func multiples(low, high float64, m, e int) []tick {
	unit := float64(m) * math.Pow10(e)
	from, to := math.Ceil(low/unit-1e-9), math.Floor(high/unit+1e-9)
	if to-from > 60 {
		return nil // far more than fit
	}
	ticks := []tick{}
	for k := from; k <= to; k++ {
		v := k * float64(m) * math.Pow10(max(e, 0)) / math.Pow10(max(-e, 0)) // one rounding, so that 0.3 is 0.3
		ticks = append(ticks, tick{v, tickNumber(v, max(-e, 0))})
	}
	return ticks
}

// fits says whether the labels stand apart, the ticks being equally spaced and not yet placed.
func (r *ruler) fits(ticks []tick, room measure) bool {
	if ticks == nil {
		return false
	}
	need := 0.0
	for _, t := range ticks {
		need = math.Max(need, room(t.label))
	}
	return need*float64(len(ticks)) <= 1 || len(ticks) <= 1
}

// tickNumber writes a number with n decimals and a true minus sign.
func tickNumber(v float64, n int) string {
	s := strconv.FormatFloat(math.Abs(v), 'f', n, 64)
	if v < 0 {
		return "\u2212" + s
	}
	return s
}

// categories sets each category in the middle of its own share, and leaves labels out where there are too many.
func (r *ruler) categories(room measure) {
	n := len(r.axis.words)
	r.low, r.high = -0.5, float64(max(n, 1))-0.5
	longest := 0.0
	for _, w := range r.axis.words {
		longest = math.Max(longest, math.Min(room(w), 0.2))
	}
	every := max(1, int(math.Ceil(longest*float64(n))))
	for i := 0; i < n; i += every {
		r.ticks = append(r.ticks, tick{r.at(float64(i)), r.axis.words[i]})
	}
}
