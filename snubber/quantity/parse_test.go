package quantity_test

import (
	"math"
	"strings"
	"testing"

	. "ringbook/snubber/quantity"
)

// Codes as IEC 60062 (Marking codes for resistors and capacitors) gives them in its examples; quoted from
// memory, the standard was not at hand.
func TestParseReadsCodesOfIEC60062(t *testing.T) {
	for _, c := range []struct {
		in   string
		unit Unit
		want float64
	}{
		{"R47", Resistance, 0.47}, {"4R7", Resistance, 4.7}, {"47R", Resistance, 47}, {"R1", Resistance, 0.1},
		{"R15", Resistance, 0.15}, {"1R5", Resistance, 1.5}, {"3R32", Resistance, 3.32}, {"10R", Resistance, 10},
		{"100R", Resistance, 100}, {"590R", Resistance, 590}, {"K1", Resistance, 100}, {"1K0", Resistance, 1e3},
		{"3K32", Resistance, 3320}, {"4K7", Resistance, 4700}, {"4k7", Resistance, 4700}, {"10K", Resistance, 10e3},
		{"100K", Resistance, 100e3}, {"1M0", Resistance, 1e6}, {"4M7", Resistance, 4.7e6}, {"10M", Resistance, 10e6},
		{"1G0", Resistance, 1e9},
		{"p1", Capacitance, 0.1e-12}, {"p15", Capacitance, 0.15e-12}, {"1p0", Capacitance, 1e-12}, {"3p32", Capacitance, 3.32e-12},
		{"5p9", Capacitance, 5.9e-12}, {"470p", Capacitance, 470e-12}, {"n33", Capacitance, 0.33e-9}, {"1n0", Capacitance, 1e-9},
		{"2n2", Capacitance, 2.2e-9}, {"2u2", Capacitance, 2.2e-6}, {"4\u00b57", Capacitance, 4.7e-6}, {"4\u03bc7", Capacitance, 4.7e-6},
		{"1m0", Capacitance, 1e-3}, {"1F0", Capacitance, 1}, {"3V3", Voltage, 3.3}, {"2n2F", Capacitance, 2.2e-9}, {"4k7 ohm", Resistance, 4700},
		{"-3V3", Voltage, -3.3},
	} {
		if got, err := Parse(c.in, c.unit); err != nil || got != c.want {
			t.Errorf("Parse(%q) = %v, %v; want %v", c.in, got, err, c.want)
		}
	}
}

func TestParseReadsPrefixAndUnit(t *testing.T) {
	for _, c := range []struct {
		in   string
		unit Unit
		want float64
	}{
		{"470 pF", Capacitance, 470e-12}, {"470pF", Capacitance, 470e-12}, {"470 p", Capacitance, 470e-12}, {" 470p\t\n", Capacitance, 470e-12},
		{"4.7e-10", Capacitance, 4.7e-10}, {"1.2e-9 F", Capacitance, 1.2e-9}, {"1E-9", Capacitance, 1e-9}, {"0", Capacitance, 0}, {"0p", Capacitance, 0}, {"-0", Capacitance, 0},
		{"10f", Capacitance, 10e-15}, {".5n", Capacitance, .5e-9}, {"5.n", Capacitance, 5e-9}, {"+5n", Capacitance, 5e-9},
		{"12 nH", Inductance, 12e-9}, {"12\u00a0nH", Inductance, 12e-9}, {"12\u202fnH", Inductance, 12e-9},
		{"10", Resistance, 10}, {"10 R", Resistance, 10}, {"10 ohm", Resistance, 10}, {"4.7 kohm", Resistance, 4700}, {"4.7k ohm", Resistance, 4700},
		{"4.7k\u03a9", Resistance, 4700}, {"4.7k\u2126", Resistance, 4700}, {"47 K\u03a9", Resistance, 47e3}, {"10m", Resistance, 10e-3}, {"10M", Resistance, 10e6},
		{"48V", Voltage, 48}, {"-48 V", Voltage, -48}, {"\u221248 V", Voltage, -48}, {"3.3kV", Voltage, 3300},
		{"2.5 A", Current, 2.5}, {"1.8MHz", Frequency, 1.8e6}, {"1.8M", Frequency, 1.8e6}, {"100 kHz", Frequency, 100e3}, {"1mHz", Frequency, 1e-3},
		{"0.5us", Time, 0.5e-6}, {"0.5\u00b5s", Time, 0.5e-6}, {"0.5 \u03bcs", Time, 0.5e-6}, {"250mW", Power, 0.25}, {"2.2 uJ", Energy, 2.2e-6},
		{"25", Temperature, 25}, {"-40 degC", Temperature, -40}, {"25 \u00b0C", Temperature, 25}, {"0.35", Ratio, 0.35},
	} {
		if got, err := Parse(c.in, c.unit); err != nil || got != c.want || math.Signbit(got) != math.Signbit(c.want) {
			t.Errorf("Parse(%q) = %v, %v; want %v", c.in, got, err, c.want)
		}
	}
}

// Each refusal names the input, why, and what to write.
func TestParseRefuses(t *testing.T) {
	for _, c := range []struct {
		in   string
		unit Unit
		why  string
	}{
		{"47 kV", Capacitance, `quantity "47 kV": a capacitance was expected, in farad; write for example 470p or 470 pF`},
		{"48V", Capacitance, "a capacitance was expected, in farad"},
		{"10R", Capacitance, "a capacitance was expected, in farad"},
		{"470p", Ratio, "a plain number was expected"},
		{"25m", Temperature, "a temperature was expected, in degree Celsius"},
		{"25m5", Temperature, "a temperature was expected"},
		{"", Inductance, `quantity "": nothing was given, and an inductance was expected, in henry; write for example 12n or 12 nH`},
		{"  ", Inductance, "nothing was given"},
		{"4,7", Resistance, "the decimal mark is a point"},
		{"1,000", Resistance, "digits are not grouped"},
		{"NaN", Resistance, "a finite number was expected"}, {"-inf", Voltage, "a finite number was expected"}, {"Infinity", Voltage, "a finite number"},
		{"1e400", Voltage, "beyond the numbers a computer holds"}, {"1e-400", Voltage, "beyond the numbers"}, {"9" + strings.Repeat("0", 400), Voltage, "beyond the numbers"},
		{"-470p", Capacitance, "a capacitance cannot be negative"}, {"-4k7", Resistance, "a resistance cannot be negative"}, {"-1e-300", Frequency, "a frequency cannot be negative"},
		{"4kk", Resistance, "two prefixes were found; keep one"}, {"4kkohm", Resistance, "two prefixes"}, {"4pn", Capacitance, "two prefixes"}, {"1e3k", Resistance, "keep one"},
		{"4k7k", Resistance, "neither a prefix nor a unit"}, {"10kR", Resistance, "neither a prefix"}, {"4k7R", Resistance, "neither a prefix"},
		{"2.2n2", Capacitance, "neither a prefix"}, {"1 2", Capacitance, "neither a prefix"}, {"4.7 k ohm", Resistance, "neither a prefix"}, {"1e", Voltage, "neither a prefix"},
		{"1.8mhz", Frequency, "hertz is written Hz"}, {"470 pf", Capacitance, "farad is written F"}, {"48v", Voltage, "capitals matter"},
		{"10 KHz", Frequency, "the prefix kilo is a small k"}, {"470 PF", Capacitance, `"P" is no prefix here`},
		{"volts", Voltage, "it has no number"}, {"pF", Capacitance, "it has no number"}, {"-", Voltage, "no number"}, {".", Voltage, "no number"}, {"--5", Voltage, "no number"},
		{"0x10", Voltage, "neither a prefix"}, {"1_000", Voltage, "neither a prefix"}, {"\u0663", Voltage, "no number"}, {"1\xff", Voltage, "neither a prefix"},
		{"5%", Ratio, "a plain number was expected"},
	} {
		v, err := Parse(c.in, c.unit)
		if err == nil {
			t.Errorf("Parse(%q) = %v; want an error with %q", c.in, v, c.why)
			continue
		}
		if text := err.Error(); !strings.Contains(text, c.why) || !strings.HasSuffix(text, "; write for example "+c.unit.Example()) {
			t.Errorf("Parse(%q): error %q; want %q and the cure", c.in, text, c.why)
		}
	}
}

func TestParseCutsAFloodInItsError(t *testing.T) {
	_, err := Parse(strings.Repeat("\u03a9", 1e6), Resistance)
	if err == nil || len(err.Error()) > 400 {
		t.Errorf("error of %d bytes; want a short one", len(err.Error()))
	}
}

// What a unit shows as its example is what Parse reads.
func TestExamplesAreReadable(t *testing.T) {
	for u := Ratio; u <= Temperature; u++ {
		var first float64
		for i, example := range strings.Split(u.Example(), " or ") {
			v, err := Parse(example, u)
			if err != nil {
				t.Error(err)
			}
			if i == 0 {
				first = v
			} else if v != first {
				t.Errorf("%q: the examples differ, %v and %v", u.Example(), first, v)
			}
		}
	}
}

func TestUnknownUnitIsAPlainNumber(t *testing.T) {
	if v, err := Parse("5", Unit(200)); v != 5 || err != nil {
		t.Errorf("got %v, %v", v, err)
	}
	if got := Format(5, Unit(200), 2); got != "5.0" {
		t.Errorf("got %q", got)
	}
}

func TestParseFraction(t *testing.T) {
	for in, want := range map[string]float64{
		"5%": 0.05, "0.05": 0.05, "0.5 %": 0.005, " 20 % ": 0.2, "0": 0, "1": 1, "100%": 1, "150%": 1.5, "-3%": -0.03, "1e-3": 1e-3, "33.3%": 0.333, "0.7%": 0.007,
	} {
		if got, err := ParseFraction(in); err != nil || got != want {
			t.Errorf("ParseFraction(%q) = %v, %v; want %v", in, got, err, want)
		}
	}
	for in, why := range map[string]string{
		"": "nothing was given", "5": "more than the whole", "0,05": "decimal mark is a point", "5%%": "only a percent sign", "5 percent": "only a percent sign",
		"NaN": "finite", "%": "finite number or percentage", "1e3%": "keep one", "1e999%": "keep one", "1e-999": "beyond the numbers", "5k": "only a percent sign",
	} {
		v, err := ParseFraction(in)
		if err == nil || !strings.Contains(err.Error(), why) || !strings.HasSuffix(err.Error(), "write for example 5% or 0.05") {
			t.Errorf("ParseFraction(%q) = %v, %v; want an error with %q", in, v, err, why)
		}
	}
}
