package quantity_test

import (
	"math"
	"strings"
	"testing"

	. "ringbook/snubber/quantity"
)

func TestFormatUncertain(t *testing.T) {
	for _, c := range []struct {
		v, u float64
		unit Unit
		want string
	}{
		// JCGM 100:2008 (GUM), 7.2.2: m_S = 100.02147(35) g, with u_c = 0.35 mg.
		{100.02147, 0.35e-3, Ratio, "100.02147(35)"},
		{12.34e-9, 0.56e-9, Inductance, "12.34(56) nH"}, {12.3449e-9, 0.5551e-9, Inductance, "12.34(56) nH"},
		{180e-12, 1.2e-12, Capacitance, "180.0(12) pF"}, {180e-12, 12e-12, Capacitance, "180(12) pF"}, {108.2912e6, 1200, Frequency, "108.2912(12) MHz"},
		// The uncertainty's rounding carries.
		{1.23456, 0.0996, Voltage, "1.23(10) V"}, {1.23456, 0.0994, Voltage, "1.235(99) V"}, {50, 0.996, Voltage, "50.0(10) V"},
		// The value's rounding carries, into the prefix too.
		{999.996, 0.12, Voltage, "1.00000(12) kV"}, {999.996, 0.0012, Voltage, "999.9960(12) V"}, {9.9996, 0.012, Voltage, "10.000(12) V"},
		// Uncertainty before the point.
		{1234, 56, Temperature, "1234(56) \u00b0C"}, {1234, 560, Temperature, "1230(560) \u00b0C"}, {1234, 56, Voltage, "1.234(56) kV"}, {1236, 5600, Ratio, "1200(5600)"},
		// Uncertainty above the value.
		{3e-9, 46e-9, Inductance, "3(46) nH"}, {3e-9, 560e-9, Inductance, "0(560) nH"}, {6e-9, 560e-9, Inductance, "10(560) nH"}, {5e-9, 5600e-9, Inductance, "0.0(56) \u00b5H"},
		{0.3e-6, 1e-6, Inductance, "0.3(10) \u00b5H"}, {-3e-9, 46e-9, Inductance, "-3(46) nH"}, {-0.2, 46, Voltage, "0(46) V"}, {0, 46, Voltage, "0(46) V"}, {0, 0.046, Voltage, "0(46) mV"}, {0, 1, Voltage, "0.0(10) V"},
		{1e-300, 1, Voltage, "0.0(10) V"}, {1, 1e300, Voltage, "0.0(10)e300 V"},
		{50, 1200, Ratio, "0(1200)"}, {51, 1200, Ratio, "100(1200)"}, {49, 1200, Ratio, "0(1200)"}, {950, 1200, Ratio, "1000(1200)"}, {960, 1200, Ratio, "1000(1200)"},
		// Out of the prefixes.
		{1.234e-18, 0.056e-18, Capacitance, "1.234(56)e-18 F"}, {3e-18, 5.6e-18, Capacitance, "3.0(56)e-18 F"}, {1.234e15, 0.056e15, Frequency, "1.234(56)e15 Hz"},
		// Nothing to say about the uncertainty, or too little.
		{470e-12, 0, Capacitance, "470 pF"}, {470e-12, math.NaN(), Capacitance, "470(?) pF"}, {470e-12, -1e-12, Capacitance, "470(?) pF"}, {470e-12, math.Inf(1), Capacitance, "470(?) pF"},
		{1e-18, math.NaN(), Capacitance, "1(?)e-18 F"}, {0.35, math.NaN(), Ratio, "0.35(?)"}, {1, 1e-20, Voltage, "1 V"},
		{math.NaN(), 1, Voltage, "NaN"}, {math.NaN(), math.NaN(), Voltage, "NaN"}, {math.Inf(-1), 1, Voltage, "-Inf"},
	} {
		if got := FormatUncertain(c.v, c.u, c.unit); got != c.want {
			t.Errorf("FormatUncertain(%v, %v) = %q; want %q", c.v, c.u, got, c.want)
		}
	}
}

func TestParseUncertain(t *testing.T) {
	for _, c := range []struct {
		in   string
		unit Unit
		v, u float64
	}{
		{"100.02147(35)", Ratio, 100.02147, 0.00035},      // GUM 7.2.2, second form
		{"100.02147(0.00035)", Ratio, 100.02147, 0.00035}, // GUM 7.2.2, third form
		{"12.34(56) nH", Inductance, 12.34e-9, 0.56e-9}, {"12.34(0.56)nH", Inductance, 12.34e-9, 0.56e-9}, {"12.34(56)n", Inductance, 12.34e-9, 0.56e-9},
		{"1234(56)", Temperature, 1234, 56}, {"0(560) nH", Inductance, 0, 560e-9}, {"-3(46) nH", Inductance, -3e-9, 46e-9}, {"1.234(56)e-18 F", Capacitance, 1.234e-18, 0.056e-18},
		{"470 pF", Capacitance, 470e-12, 0}, {"-470 pF", Capacitance, -470e-12, 0}, {"4k7", Resistance, 4700, 0}, {" 5.0(5) V ", Voltage, 5, 0.5},
	} {
		if v, u, err := ParseUncertain(c.in, c.unit); err != nil || v != c.v || u != c.u {
			t.Errorf("ParseUncertain(%q) = %v, %v, %v; want %v, %v", c.in, v, u, err, c.v, c.u)
		}
	}
	if v, u, err := ParseUncertain("470(?) pF", Capacitance); err != nil || v != 470e-12 || !math.IsNaN(u) {
		t.Errorf("unknown uncertainty: %v, %v, %v", v, u, err)
	}
}

func TestParseUncertainRefuses(t *testing.T) {
	for _, c := range []struct{ in, why string }{
		{"", "nothing was given"}, {"12,34(56)", "decimal mark is a point"}, {"12.34(56", "parentheses"}, {"(56)", "a value is to be followed"}, {"12.34 (56)", "at once"},
		{"12.34()", "to be digits"}, {"12.34(-5)", "to be digits"}, {"12.34(+5)", "to be digits"}, {"12.34(1e3)", "to be digits"}, {"12.34(NaN)", "to be digits"}, {"12.34(.)", "to be digits"},
		{"12.34(56)(7)", "neither a prefix"}, {"12.34(56) V", "in henry"}, {"12.34(56)e-3 nH", "keep one"}, {"1e3(5)", "at once"}, {"1(5)e999999999999999999999", "beyond the numbers"},
		{"1(5)e500", "beyond the numbers"}, {"1(5)e-500", "beyond the numbers"}, {"0(5)e500", "beyond the numbers"}, {"0.0(5)e-9223372036854775808", "beyond the numbers"}, {"4k7(5)", "at once"}, {"NaN", "finite"},
	} {
		v, u, err := ParseUncertain(c.in, Inductance)
		if err == nil || !strings.Contains(err.Error(), c.why) || !strings.HasPrefix(err.Error(), "quantity \""+c.in) {
			t.Errorf("ParseUncertain(%q) = %v, %v, %v; want an error with %q", c.in, v, u, err, c.why)
		}
	}
}
