package quantity_test

import (
	"strconv"
	"testing"

	"pgregory.net/rapid"

	. "ringbook/snubber/quantity"
)

var coded = []Unit{Resistance, Capacitance, Inductance, Voltage, Current, Power}

// Every value of up to three digits has a code, and the code reads back as exactly that value.
func TestCodeReadsBackExactly(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		unit := rapid.SampledFrom(coded).Draw(t, "unit")
		mantissa := rapid.IntRange(1, 999).Draw(t, "mantissa")
		power := rapid.IntRange(-15, 9).Draw(t, "power")
		v, _ := strconv.ParseFloat(strconv.Itoa(mantissa)+"e"+strconv.Itoa(power), 64)
		code := Code(v, unit)
		if back, err := Parse(code, unit); err != nil || back != v {
			t.Fatalf("Code(%v) = %q, read back %v, %v", v, code, back, err)
		}
		if len([]rune(code)) > 5 && v >= 1e-15 && v < 1e12 {
			t.Fatalf("Code(%v) = %q is no code", v, code)
		}
	})
}

// A code, a prefix and an exponent say the same number.
func TestThreeSpellingsAgree(t *testing.T) {
	prefix := map[string]string{"f": "e-15", "p": "e-12", "n": "e-9", "u": "e-6", "m": "e-3", "k": "e3", "M": "e6", "G": "e9"}
	rapid.Check(t, func(t *rapid.T) {
		whole := strconv.Itoa(rapid.IntRange(0, 9999).Draw(t, "whole"))
		fraction := rapid.StringMatching(`[0-9]{1,6}`).Draw(t, "fraction")
		p := rapid.SampledFrom([]string{"f", "p", "n", "u", "m", "k", "M", "G"}).Draw(t, "prefix")
		want, _ := strconv.ParseFloat(whole+"."+fraction+prefix[p], 64)
		for _, s := range []string{whole + p + fraction, whole + "." + fraction + p, whole + "." + fraction + " " + p + "F", whole + "." + fraction + prefix[p] + "F"} {
			if got, err := Parse(s, Capacitance); err != nil || got != want {
				t.Fatalf("Parse(%q) = %v, %v; want %v", s, got, err, want)
			}
		}
	})
}

// Scale leaves the largest value of a column between 1 and 1000.
func TestScaleLeavesOneToThreeDigits(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64Range(1e-15, 9.99e11).Draw(t, "v")
		factor, _ := Scale(v)
		if x := v * factor; x < 1-1e-12 || x >= 1000 {
			t.Fatalf("Scale(%v) = %v leaves %v", v, factor, x)
		}
	})
}

// What a flag value shows, it reads back as the same value.
func TestFlagValuesReadWhatTheyShow(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		farad := Farad(rapid.Float64Range(1e-15, 1).Draw(t, "farad"))
		henry := Henry(rapid.Float64Range(1e-12, 1).Draw(t, "henry"))
		hertz := Hertz(rapid.Float64Range(1, 100e9).Draw(t, "hertz"))
		fraction := Fraction(rapid.Float64Range(0, 1).Draw(t, "fraction"))
		var farad2 Farad
		var henry2 Henry
		var hertz2 Hertz
		var fraction2 Fraction
		for _, err := range []error{farad2.Set(farad.String()), henry2.Set(henry.String()), hertz2.Set(hertz.String()), fraction2.Set(fraction.String())} {
			if err != nil {
				t.Fatal(err)
			}
		}
		if farad2 != farad || henry2 != henry || hertz2 != hertz || fraction2 != fraction {
			t.Fatalf("%v %v %v %v read back as %v %v %v %v", farad, henry, hertz, fraction, farad2, henry2, hertz2, fraction2)
		}
	})
}
