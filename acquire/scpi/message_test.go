package scpi

import (
	"math"
	"strings"
	"testing"
)

func TestMessage(t *testing.T) {
	for _, c := range []struct {
		header string
		args   []Arg
		want   string
	}{
		{"*RST", nil, "*RST"},
		{":SOURce:VOLTage:LEVel", []Arg{Number(48)}, ":SOURce:VOLTage:LEVel 4.8E+01"},
		{"CHAN1:SCALe", []Arg{Number(1)}, "CHAN1:SCALe 1.0E+00"},
		{"ROUTe:FIT", []Arg{Word("rc"), Number(470e-12), Number(10)}, "ROUTe:FIT rc,4.7E-10,1.0E+01"},
		{"DISPlay:TEXT", []Arg{Text(`a "b" c`)}, `DISPlay:TEXT "a ""b"" c"`},
		{"MEASure:FREQuency?", []Arg{Word("CHANnel1")}, "MEASure:FREQuency? CHANnel1"},
	} {
		if got, err := message(c.header, c.args); err != nil || got != c.want {
			t.Errorf("message(%q) = %q, %v; want %q", c.header, got, err, c.want)
		}
	}
}

// Whatever a caller interpolates, one call sends one message.
func TestInjection(t *testing.T) {
	for _, evil := range []string{"x\n*RST", "x\r*RST", "x;*RST", "x\x00", "x\x1b[2J", "caf\u00e9", "\xff"} {
		for name, m := range map[string]func() (string, error){
			"text":       func() (string, error) { return message("A:B", []Arg{Text(evil)}) },
			"word":       func() (string, error) { return message("A:B", []Arg{Word(evil)}) },
			"header":     func() (string, error) { return message("A:"+evil, nil) },
			"star":       func() (string, error) { return message("*"+evil, nil) },
			"unit":       func() (string, error) { h, a, err := ParseUnit("A:B " + evil); _ = a; return h, err },
			"unit alone": func() (string, error) { h, a, err := ParseUnit(evil); _ = a; return h, err },
		} {
			if got, err := m(); err == nil {
				t.Errorf("%s with %q gives %q; want a refusal", name, evil, got)
			}
		}
	}
	for _, header := range []string{"", "?", "*", "*?", ":", "A::B", "A B", "1A", "A:", "*1", "A,B", "A??", "A?B", "\"A\""} {
		if got, err := message(header, nil); err == nil {
			t.Errorf("header %q gives %q; want a refusal", header, got)
		}
	}
	for _, v := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
		if _, err := message("A", []Arg{Number(v)}); err == nil {
			t.Errorf("Number(%g) was not refused", v)
		}
	}
	if _, err := message("A", []Arg{Word("on off")}); err == nil {
		t.Error("a word with a space was not refused")
	}
}

func TestParseUnit(t *testing.T) {
	header, args, err := ParseUnit("  MEASure:VPP?\t CHANnel1, 'x'  ")
	if err != nil || header != "MEASure:VPP?" || len(args) != 1 || args[0].text != "CHANnel1, 'x'" {
		t.Errorf("%q, %v, %v", header, args, err)
	}
	if _, _, err := ParseUnit("VOLT 5; CURR 1"); err == nil || !strings.Contains(err.Error(), "one message at a time") {
		t.Errorf("two units gave %v", err)
	}
}
