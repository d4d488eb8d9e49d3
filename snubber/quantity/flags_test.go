package quantity_test

import (
	"encoding/json"
	"strings"
	"testing"

	"github.com/spf13/cobra"

	. "ringbook/snubber/quantity"
)

// value is what both the standard flag package and cobra's flags ask of a value.
type value interface {
	String() string
	Set(string) error
	Type() string
}

func TestFlagValues(t *testing.T) {
	for _, c := range []struct {
		v              value
		typ, zero      string
		in, shown      string
		refused, cause string
	}{
		{new(Farad), "F", "0", "470pF", "470 pF", "470", "that is 470 F, and a capacitance here lies between 1 fF and 1 F; check the prefix"},
		{new(Farad), "F", "0", "0", "0", "-470p", "a capacitance cannot be negative"},
		{new(Henry), "H", "", "12 nH", "12 nH", "0", "an inductance of zero makes no sense"},
		{new(Henry), "H", "", "0.417", "417 mH", "12", "check the prefix"},
		{new(Ohm), "ohm", "0", "4k7 ohm", "4.7 k\u03a9", "-1", "cannot be negative"},
		{new(Volt), "V", "0", "48V", "48 V", "-48V", "a voltage cannot be negative here"},
		{new(Ampere), "A", "0", "2.5A", "2.5 A", "-2.5", "cannot be negative here"},
		{new(Hertz), "Hz", "", "1.8MHz", "1.8 MHz", "1.8mHz", "that is 1.8 mHz, and a frequency here lies between 1 Hz and 100 GHz"},
		{new(Hertz), "Hz", "", "100k", "100 kHz", "0", "of zero makes no sense"},
		{new(Second), "s", "", "0.5us", "500 ns", "-1n", "cannot be negative here"},
		{new(Watt), "W", "0", "250 mW", "250 mW", "1e12", "check the prefix"},
		{new(Fraction), "fraction", "0", "5%", "5%", "110%", "between 0 and 1"},
		{new(Fraction), "fraction", "0", "0.005", "0.5%", "-3%", "between 0 and 1"},
	} {
		if c.v.Type() != c.typ || c.v.String() != c.zero {
			t.Errorf("%T: type %q, zero %q; want %q, %q", c.v, c.v.Type(), c.v.String(), c.typ, c.zero)
		}
		if err := c.v.Set(c.in); err != nil || c.v.String() != c.shown {
			t.Errorf("%T: Set(%q): %v, then %q; want %q", c.v, c.in, err, c.v.String(), c.shown)
		}
		err := c.v.Set(c.refused)
		if err == nil || !strings.Contains(err.Error(), c.cause) || !strings.Contains(err.Error(), `"`+c.refused+`"`) || !strings.Contains(err.Error(), "write for example") {
			t.Errorf("%T: Set(%q): %v; want the input, %q and the cure", c.v, c.refused, err, c.cause)
		}
		if c.v.String() != c.shown {
			t.Errorf("%T: a refused Set left %q behind", c.v, c.v.String())
		}
	}
}

func TestFlagsInAHelpText(t *testing.T) {
	c, peak, l := Farad(0), Volt(80), Henry(0)
	cmd := &cobra.Command{Use: "x"}
	cmd.Flags().Var(&c, "probe-c", "probe capacitance")
	cmd.Flags().Var(&peak, "max-peak", "highest peak")
	cmd.Flags().Var(&l, "inductance", "loop inductance")
	usage := cmd.Flags().FlagUsages()
	for _, want := range []string{"--probe-c F ", "--max-peak V ", "(default 80 V)", "--inductance H "} {
		if !strings.Contains(usage, want) {
			t.Errorf("usage lacks %q:\n%s", want, usage)
		}
	}
	if strings.Count(usage, "default") != 1 {
		t.Errorf("a zero default is shown:\n%s", usage)
	}
	err := cmd.ParseFlags([]string{"--probe-c", "9.5pF", "--max-peak", "80 A"})
	if c != 9.5e-12 || err == nil || !strings.Contains(err.Error(), `quantity "80 A": a voltage was expected, in volt`) {
		t.Errorf("c = %v, err = %v", c, err)
	}
}

// JSON and CSV carry unscaled SI: the types are plain numbers there.
func TestFlagValuesAreNumbersInJSON(t *testing.T) {
	b, err := json.Marshal(struct {
		C Farad `json:"c_f"`
	}{4.7e-10})
	if err != nil || string(b) != `{"c_f":4.7e-10}` {
		t.Errorf("got %s, %v", b, err)
	}
}
