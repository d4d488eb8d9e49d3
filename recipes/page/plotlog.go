package page

import (
	"math"
	"strconv"

	"ringbook/snubber/quantity"
)

// logTicks marks 1, 2 and 5 times the powers of ten, or the powers of ten alone where there is no room, or every
// so many of them. Less than half a decade has the ticks of a linear axis.
func (r *ruler) logTicks(room measure) {
	factor, symbol := r.axis.shownLog(r.low, r.high)
	r.symbol = symbol
	offset := math.Log10(factor)
	low, high := r.low+offset, r.high+offset // of the shown values
	if high-low < 0.8 {
		r.fewTicks(factor, math.Pow(10, low), math.Pow(10, high), room)
		return
	}
	span := high - low
	labelled := func(m, e int) bool { return m == 1 || m == 2 || m == 5 }
	widest := 0.0
	for e := int(math.Floor(low)); e <= int(math.Floor(high)); e++ {
		widest = math.Max(widest, room(logNumber(1, e)))
	}
	switch {
	case 0.3/span > widest: // 1 to 2, and 5 to 10, is the narrowest
	case 1/span > widest:
		labelled = func(m, e int) bool { return m == 1 }
	default:
		every := int(math.Ceil(widest * span))
		labelled = func(m, e int) bool { return m == 1 && e%every == 0 }
	}
	for e := int(math.Floor(low)); e <= int(math.Floor(high)); e++ {
		for m := 1; m <= 9; m++ {
			at := (math.Log10(float64(m)) + float64(e) - low) / span
			if at < -1e-9 || at > 1+1e-9 {
				continue
			}
			t := tick{at: at}
			if labelled(m, e) {
				t.label = logNumber(m, e)
			} else if span > 4 && m != 1 {
				continue
			}
			r.ticks = append(r.ticks, t)
		}
	}
}

// fewTicks are the ticks of a linear axis at their places on a short logarithmic one.
func (r *ruler) fewTicks(factor, low, high float64, room measure) {
	squeezed := func(label string) float64 { return room(label) * 1.6 } // they stand closer at the upper end
	for e := int(math.Floor(math.Log10(high-low))) - 2; ; e++ {
		for _, m := range []int{1, 2, 5} {
			if r.ticks = multiples(low, high, m, e); r.fits(r.ticks, squeezed) {
				for i := range r.ticks {
					r.ticks[i].at = r.at(r.ticks[i].at / factor)
				}
				return
			}
		}
	}
}

// shownLog is the factor and the unit of a logarithmic axis between two decadic logarithms: the prefix that makes
// the decades' labels shortest.
func (a Axis) shownLog(low, high float64) (factor float64, symbol string) {
	if a.factor != 0 || a.unit == quantity.Ratio || a.unit == quantity.Temperature || high < -18 || low > 15 {
		return a.shown(math.Pow(10, (low+high)/2))
	}
	best := math.MaxInt
	for p := -15; p <= 9; p += 3 {
		n := 0
		for e := int(math.Ceil(low - 1e-9)); e <= int(math.Floor(high+1e-9)); e++ {
			n += max(e-p+1, p-e+2) // digits of 100 and of 0.01
		}
		if n == 0 { // no power of ten is within
			return a.shown(math.Pow(10, high))
		}
		if n < best {
			f, prefix := quantity.Scale(math.Pow10(p))
			best, factor, symbol = n, f, prefix+a.unit.Symbol()
		}
	}
	return factor, symbol
}

// logNumber writes m times ten to the power e.
func logNumber(m, e int) string {
	if e < -3 || e > 5 {
		return strconv.Itoa(m) + "e" + strconv.Itoa(e)
	}
	return strconv.FormatFloat(float64(m)*math.Pow10(max(e, 0))/math.Pow10(max(-e, 0)), 'f', max(-e, 0), 64)
}
