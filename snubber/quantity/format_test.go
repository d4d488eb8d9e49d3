package quantity_test

import (
	"math"
	"testing"

	. "ringbook/snubber/quantity"
)

func TestFormat(t *testing.T) {
	for _, c := range []struct {
		v      float64
		unit   Unit
		digits int
		want   string
	}{
		{470e-12, Capacitance, 3, "470 pF"}, {12.34e-9, Inductance, 3, "12.3 nH"}, {2.2e-6, Capacitance, 2, "2.2 \u00b5F"},
		{4700, Resistance, 2, "4.7 k\u03a9"}, {48, Voltage, 2, "48 V"}, {48, Voltage, 0, "48 V"}, {1.8e6, Frequency, 3, "1.80 MHz"},
		{999.949, Voltage, 4, "999.9 V"}, {999.951, Voltage, 4, "1.000 kV"}, {999.951, Voltage, 3, "1.00 kV"}, {0.9996e-9, Inductance, 3, "1.00 nH"},
		{999.9e-15, Capacitance, 3, "1.00 pF"},
		{470e-12, Capacitance, 1, "500 pF"}, {470e-12, Capacitance, 2, "470 pF"},
		{0, Capacitance, 3, "0 F"}, {math.Copysign(0, -1), Voltage, 3, "0 V"}, {-3.3, Voltage, 3, "-3.30 V"}, {-1e-3, Voltage, 1, "-1 mV"},
		{math.NaN(), Voltage, 3, "NaN"}, {math.Inf(1), Voltage, 3, "Inf"}, {math.Inf(-1), Voltage, 0, "-Inf"},
		{1.234e-18, Capacitance, 3, "1.23e-18 F"}, {1.5e12, Frequency, 2, "1.5e12 Hz"}, {999.9e9, Frequency, 3, "1.00e12 Hz"}, {999e9, Frequency, 3, "999 GHz"},
		{0.9999e-15, Capacitance, 2, "1.0 fF"}, {5e-324, Voltage, 0, "5e-324 V"}, {math.MaxFloat64, Voltage, 3, "1.80e308 V"},
		{25, Temperature, 3, "25.0 \u00b0C"}, {1250, Temperature, 4, "1250 \u00b0C"}, {-40, Temperature, 2, "-40 \u00b0C"}, {0.001, Temperature, 1, "0.001 \u00b0C"},
		{0.35355, Ratio, 3, "0.354"}, {1e6, Ratio, 2, "1.0e6"}, {0.30000000000000004, Ratio, 0, "0.30000000000000004"}, {1. / 3, Ratio, 99, "0.33333333333333331"},
		{4.7e-10, Capacitance, -3, "470 pF"},
	} {
		if got := Format(c.v, c.unit, c.digits); got != c.want {
			t.Errorf("Format(%v, %d digits) = %q; want %q", c.v, c.digits, got, c.want)
		}
	}
}

func TestScale(t *testing.T) {
	for _, c := range []struct {
		largest, factor float64
		prefix          string
	}{
		{4.7e-7, 1e9, "n"}, {-4.7e-7, 1e9, "n"}, {1e-6, 1e6, "\u00b5"}, {0.999e-6, 1e9, "n"}, {1e-9, 1e9, "n"}, {1e-12, 1e12, "p"}, {48, 1, ""}, {999, 1, ""}, {1000, 1e-3, "k"},
		{1.08e8, 1e-6, "M"}, {0, 1, ""}, {math.NaN(), 1, ""}, {math.Inf(1), 1, ""}, {1e-20, 1e15, "f"}, {1e20, 1e-9, "G"},
	} {
		if factor, prefix := Scale(c.largest); factor != c.factor || prefix != c.prefix {
			t.Errorf("Scale(%v) = %v, %q; want %v, %q", c.largest, factor, prefix, c.factor, c.prefix)
		}
	}
}

func TestCode(t *testing.T) {
	for _, c := range []struct {
		v    float64
		unit Unit
		want string
	}{
		// Forms of IEC 60062, from memory.
		{4700, Resistance, "4k7"}, {470e-12, Capacitance, "470p"}, {2.2e-9, Capacitance, "2n2"}, {10, Resistance, "10R"}, {0.47, Resistance, "R47"}, {1e6, Resistance, "1M0"},
		{4.7, Resistance, "4R7"}, {1, Resistance, "1R0"}, {100e3, Resistance, "100k"}, {3320, Resistance, "3k32"}, {0.33e-12, Capacitance, "p33"}, {2.2e-6, Capacitance, "2\u00b52"},
		{10e-9, Inductance, "10n"}, {10.5e3, Resistance, "10k5"}, {105, Resistance, "105R"}, {1, Capacitance, "1F0"}, {3.3, Voltage, "3V3"}, {-3.3, Voltage, "-3V3"},
		// Outside the standard's examples.
		{0, Resistance, "0R"}, {0, Capacitance, "0F"}, {10e-3, Resistance, "10m"}, {47e-15, Capacitance, "47f"}, {100e9, Resistance, "100G"},
		{471.34e-12, Capacitance, "471.3 pF"}, {1e-18, Capacitance, "1e-18 F"}, {1e12, Resistance, "1e12 \u03a9"}, {1.8e6, Frequency, "1.8 MHz"}, {0.35, Ratio, "0.35"}, {0, Ratio, "0"}, {math.NaN(), Resistance, "NaN"},
	} {
		if got := Code(c.v, c.unit); got != c.want {
			t.Errorf("Code(%v) = %q; want %q", c.v, got, c.want)
		}
	}
}
