package acquire

import (
	"os"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"ringbook/snubber"
)

const wholeDrawer = `
[capacitor.C3]
value       = "470p"
tolerance   = "5%"
measured    = "463p"
measured_u  = "2p"
measured_at = 2026-03-01
dielectric  = "C0G"
instrument  = "relays"
switch      = "ROUTe:CLOSe (@3)"
unswitch    = ["ROUTe:OPEN (@3)", "*WAI"]

[capacitor."blue bag"]
value = "100p"

[resistor.R1]
value     = "4R7"
tolerance = "1%"
`

func TestDrawer(t *testing.T) {
	got, err := ParseDrawer("drawer.toml", []byte(wholeDrawer))
	if err != nil {
		t.Fatal(err)
	}
	want := Drawer{
		Capacitors: []Part{
			{Name: "blue bag", Value: 100e-12},
			{Name: "C3", Value: 470e-12, Tol: 0.05, Measured: 463e-12, MeasuredU: 2e-12, MeasuredAt: got.Capacitors[1].MeasuredAt, Dielectric: "C0G",
				Instrument: "relays", Switch: []string{"ROUTe:CLOSe (@3)"}, Unswitch: []string{"ROUTe:OPEN (@3)", "*WAI"}},
		},
		Resistors: []Part{{Name: "R1", Value: 4.7, Tol: 0.01}},
	}
	if d := cmp.Diff(want, got); d != "" {
		t.Error(d)
	}
	if at := got.Capacitors[1].MeasuredAt.Format(time.DateOnly); at != "2026-03-01" {
		t.Errorf("measured at %s", at)
	}
	n := snubber.Network{Kind: snubber.C, C: 470e-12, CTol: 0.05, MeasuredC: 463e-12, MeasuredU: 2e-12}
	if c3 := got.Capacitors[1]; c3.Network() != n || c3.Candidate(0.1) != (snubber.Candidate{C: 463e-12, CTol: 0.05, U: 2e-12}) || !c3.Switched() {
		t.Errorf("%+v, %+v", c3.Network(), c3.Candidate(0.1))
	}
	if blue := got.Capacitors[0]; blue.Candidate(0.1) != (snubber.Candidate{C: 100e-12, CTol: 0.1}) || blue.Switched() {
		t.Errorf("%+v", blue.Candidate(0.1))
	}
}

// The file in the documentation is one that is read.
func TestDrawerOfTheDocumentation(t *testing.T) {
	source, err := os.ReadFile("drawer.go")
	if err != nil {
		t.Fatal(err)
	}
	var text strings.Builder
	for line := range strings.Lines(string(source)) {
		if code, ok := strings.CutPrefix(line, "//\t"); ok {
			text.WriteString(code)
		}
	}
	d, err := ParseDrawer("drawer.go", []byte(text.String()))
	if err != nil || len(d.Capacitors) != 1 || len(d.Resistors) != 1 {
		t.Errorf("%+v, %v of\n%s", d, err, text.String())
	}
}

func TestBadDrawers(t *testing.T) {
	for _, x := range []struct{ text, want string }{
		{"", "there is no part in it"},
		{"[capacitor.C1]\nvalue = \"-470p\"", `drawer.toml, line 2: capacitor.C1.value: quantity "-470p": a capacitance cannot be negative`},
		{"[capacitor.C1]\nvalue = \"0p\"", "line 2: capacitor.C1.value: 0: no such part"},
		{"[capacitor.C1]\nvalue = \"470\"", `"470"`},
		{"[capacitor.C1]\nvalue = 470e-12", "line 2: capacitor.C1.value: 4.7e-10: write it in quotes"},
		{"[capacitor.C1]\nvalue = \"470R\"", `"470R"`},
		{"[resistor.R1]\nvalue = \"-4R7\"", "line 2: resistor.R1.value"},
		{"[capacitor.C1]\n\ntolerance = \"5%\"", "line 1: capacitor.C1: its value is missing"},
		{"[capacitor.C1]\nvalue = \"470p\"\ntolerance = \"-5%\"", "line 3: capacitor.C1.tolerance"},
		{"[capacitor.C1]\nvalue = \"470p\"\ntolerance = \"100%\"", "line 3: capacitor.C1.tolerance: 1:"},
		{"[capacitor.C1]\nvalue = \"470p\"\nmeasured_u = \"2p\"", "line 3: capacitor.C1.measured_u: an uncertainty without"},
		{"[capacitor.C1]\nvalue = \"470p\"\nmeasured = \"463n\"", "line 3: capacitor.C1.measured: 4.63e-07 where 4.7e-10 is printed"},
		{"[capacitor.C1]\nvalue = \"470p\"\nmeasured = \"463p\"\nmeasured_u = \"-2p\"", "line 4: capacitor.C1.measured_u"},
		{"[capacitor.C1]\nvalue = \"470p\"\nmeasured = \"463p\"\nmeasured_u = \"2n\"", "line 4: capacitor.C1.measured_u: 2e-09 is more"},
		{"[capacitor.C1]\nvalue = \"470p\"\nmeasured_at = \"Monday\"", "line 3: capacitor.C1.measured_at: Monday: write a day without quotes"},
		{"[capacitor.C1]\nvalue = \"470p\"\n\ncolour = \"blue\"", "line 4: capacitor.C1.colour: there is no such key"},
		{"[inductor.L1]\nvalue = \"1u\"", "line 1: inductor.L1: there is no such key: the file holds [capacitor.NAME]"},
		{"[capacitor.C1]\nvalue = \"470p\"\nswitch = \"ROUT:CLOS (@1)\"", "capacitor.C1.unswitch: it is missing"},
		{"[capacitor.C1]\nvalue = \"470p\"\nswitch = \"A\"\nunswitch = \"B\"", "capacitor.C1.instrument: it is missing"},
		{"[capacitor.C1]\nvalue = \"470p\"\ninstrument = \"x\"", "capacitor.C1.switch: it is missing"},
		{"[capacitor.C1]\nvalue = \"470p\"\ninstrument = \"x\"\nswitch = \"A\\nB\"\nunswitch = \"B\"", "line 4: capacitor.C1.switch"},
		{"[capacitor.C1]\nvalue = \"470p\"\ninstrument = \"x\"\nswitch = 3\nunswitch = \"B\"", "line 4: capacitor.C1.switch: 3 is no message"},
		{"[capacitor.470p]\nvalue = \"470p\"", `name "470p": it reads as a value`},
		{"[capacitor.skip]\nvalue = \"470p\"", `name "skip": it means something else`},
		{"[capacitor.\" C1\"]\nvalue = \"470p\"", `name " C1"`},
		{"[capacitor.\"C\\u001b1\"]\nvalue = \"470p\"", "cannot be printed"},
		{"[capacitor.C1]\nvalue = \"470p\"\n[capacitor.C1]\nvalue = \"1n\"", "line 3"},
		{"[capacitor.C1\n", "line 2: expected"},
	} {
		_, err := ParseDrawer("drawer.toml", []byte(x.text))
		if err == nil || !strings.Contains(err.Error(), x.want) {
			t.Errorf("%q: %v, want %q", x.text, err, x.want)
		}
	}
}
