package quantity_test

import (
	"math"
	"strings"
	"testing"

	. "ringbook/snubber/quantity"
)

func unitOf(b uint8) Unit { return Unit(b % uint8(Temperature+1)) }

// Whatever is read reads the same when written in full, and whatever is refused is quoted with the cure.
func FuzzParse(f *testing.F) {
	for _, s := range []string{
		"470p", "470 pF", "2n2", "4k7", "4K7", "10R", "R47", "p47", "1M0", "48V", "3V3", "1.8MHz", "1.2e-9", "12 nH", "0.5us", "0.5 \u00b5s", "4.7 k\u2126", "25 \u00b0C",
		"", "-", ".", "4,7", "NaN", "1e400", "1e-400", "4kk", "-470p", "470 pf", "1e3k", "0x1p4", "\u221248", "1\xff",
	} {
		for u := Ratio; u <= Temperature; u++ {
			f.Add(s, uint8(u))
		}
	}
	f.Fuzz(func(t *testing.T, s string, b uint8) {
		unit := unitOf(b)
		v, err := Parse(s, unit)
		if err != nil {
			if text := err.Error(); v != 0 || !strings.HasPrefix(text, "quantity \"") || !strings.Contains(text, "; write for example ") {
				t.Fatalf("Parse(%q) = %v, %v", s, v, err)
			}
			return
		}
		if math.IsNaN(v) || math.IsInf(v, 0) || (v < 0 && !unit.Signed()) || (v == 0 && math.Signbit(v)) {
			t.Fatalf("Parse(%q) = %v", s, v)
		}
		for _, text := range []string{Format(v, unit, 0), Format(v, unit, 17)} {
			if back, err := Parse(text, unit); err != nil || back != v {
				t.Fatalf("Parse(%q) = %v, written %q, read back %v, %v", s, v, text, back, err)
			}
		}
		if e, u, err := ParseUncertain(s, unit); err != nil || e != v || u != 0 {
			t.Fatalf("ParseUncertain(%q) = %v, %v, %v; Parse gives %v", s, e, u, err, v)
		}
	})
}

// Format rounds by no more than half of its last digit, and what it writes it writes again.
func FuzzFormat(f *testing.F) {
	for _, v := range []float64{0, 470e-12, 999.95, -999.95, 0.99951, 1e-15, 1e12, 5e-324, math.MaxFloat64, math.NaN(), math.Inf(1)} {
		f.Add(v, uint8(Voltage), 4)
		f.Add(v, uint8(Temperature), 3)
	}
	f.Fuzz(func(t *testing.T, v float64, b uint8, digits int) {
		unit := unitOf(b)
		text := Format(v, unit, digits)
		back, err := Parse(text, unit)
		switch {
		case math.IsNaN(v) || math.IsInf(v, 0): // not quantities: Parse refuses them by design
			if err == nil {
				t.Fatalf("%q was read", text)
			}
			return
		case v < 0 && !unit.Signed(): // no such quantity
			return
		case math.Abs(v) > 1e308: // rounding up may leave the numbers
			return
		case err != nil:
			t.Fatalf("Format(%v) = %q: %v", v, text, err)
		}
		n := digits
		if n <= 0 || n > 17 {
			n = 17
		}
		// A subnormal's own spacing may be wider than the digits asked for.
		if bound := 0.5000001*math.Pow(10, 1-float64(n))*math.Abs(v) + 5e-324; math.Abs(back-v) > bound {
			t.Fatalf("Format(%v, %d digits) = %q, off by %g; allowed %g", v, digits, text, back-v, bound)
		}
		if again := Format(back, unit, digits); n <= 15 && math.Abs(v) > 1e-300 && again != text {
			t.Fatalf("Format(%v, %d digits) = %q, and of that %q", v, digits, text, again)
		}
	})
}

// FormatUncertain rounds u by no more than half of its second digit and v by half of that place; reading back
// and writing again changes nothing.
func FuzzFormatUncertain(f *testing.F) {
	f.Add(100.02147, 0.00035, uint8(Ratio))
	for _, v := range []float64{12.34e-9, 999.996, -3e-9, 0, 1e-18, 1e15, 50, 950, math.NaN(), math.Inf(1)} {
		for _, u := range []float64{0.56e-9, 0.12, 0.0996, 46e-9, 1200, 1e-20, 0, -1, math.NaN(), math.Inf(1)} {
			f.Add(v, u, uint8(Inductance))
			f.Add(v, u, uint8(Temperature))
		}
	}
	f.Fuzz(func(t *testing.T, v, u float64, b uint8) {
		unit := unitOf(b)
		text := FormatUncertain(v, u, unit)
		v2, u2, err := ParseUncertain(text, unit)
		switch {
		case math.IsNaN(v) || math.IsInf(v, 0): // not quantities
			if err == nil {
				t.Fatalf("%q was read", text)
			}
			return
		case math.Abs(v) > 1e307 || (u > 1e307 && !math.IsInf(u, 0)): // rounding up may leave the numbers
			return
		case err != nil:
			// A value rounded in the last places a subnormal has may read as nothing.
			if u > 0 && u < 1e-300 {
				return
			}
			t.Fatalf("FormatUncertain(%v, %v) = %q: %v", v, u, text, err)
		}
		switch {
		case !(u >= 0) || math.IsInf(u, 0):
			if v2 != v || !math.IsNaN(u2) {
				t.Fatalf("FormatUncertain(%v, %v) = %q read as %v, %v", v, u, text, v2, u2)
			}
			return
		case !strings.Contains(text, "("):
			if v2 != v || u2 != 0 || u > 1e-13*math.Abs(v) {
				t.Fatalf("FormatUncertain(%v, %v) = %q lost the uncertainty", v, u, text)
			}
			return
		case u < 1e-300: // subnormals have no two digits to keep
			return
		}
		if math.Abs(u2-u) > 0.0501*u {
			t.Fatalf("FormatUncertain(%v, %v) = %q: u read back as %v", v, u, text, u2)
		}
		if math.Abs(v2-v) > 0.0503*u+2e-16*math.Abs(v) {
			t.Fatalf("FormatUncertain(%v, %v) = %q: v read back as %v", v, u, text, v2)
		}
		if again := FormatUncertain(v2, u2, unit); again != text {
			t.Fatalf("FormatUncertain(%v, %v) = %q, and of that %q", v, u, text, again)
		}
	})
}

// ParseUncertain never panics, and what it reads survives being written.
func FuzzParseUncertain(f *testing.F) {
	for _, s := range []string{"100.02147(35)", "100.02147(0.00035)", "12.34(56) nH", "0(560) nH", "-3(46) nH", "1.234(56)e-18 F", "470(?) pF", "4k7", "12.34(56", "()", "1(5)e999999999999999999999", "00.0(00)"} {
		f.Add(s, uint8(Inductance))
		f.Add(s, uint8(Ratio))
	}
	f.Fuzz(func(t *testing.T, s string, b uint8) {
		unit := unitOf(b)
		v, u, err := ParseUncertain(s, unit)
		if err != nil {
			if v != 0 || u != 0 || !strings.HasPrefix(err.Error(), "quantity \"") {
				t.Fatalf("ParseUncertain(%q) = %v, %v, %v", s, v, u, err)
			}
			return
		}
		if math.IsNaN(v) || math.IsInf(v, 0) || math.IsInf(u, 0) || u < 0 {
			t.Fatalf("ParseUncertain(%q) = %v, %v", s, v, u)
		}
		_ = FormatUncertain(v, u, unit)
	})
}
