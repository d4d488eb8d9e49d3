package acquire_test

import (
	"math"
	"os"
	"testing"

	"ringbook/acquire"
)

// Whatever the text, a drawer is refused or holds parts that can be: positive, finite, with a tolerance below 1.
func FuzzParseDrawer(f *testing.F) {
	if text, err := os.ReadFile("testdata/drawer.toml"); err == nil {
		f.Add(text)
	}
	f.Add([]byte("[[capacitor]]\nname = \"a\"\nvalue = \"470p\"\ntolerance = \"5%\"\n"))
	f.Add([]byte("[[capacitor]]\nvalue = \"-470p\"\n"))
	f.Add([]byte("[[resistor]]\nvalue = \"4R7\"\nmeasured = \"4.8\"\nmeasured_u = \"0.1\"\n"))
	f.Fuzz(func(t *testing.T, text []byte) {
		d, err := acquire.ParseDrawer("drawer.toml", text)
		if err != nil {
			return
		}
		for _, p := range append(append([]acquire.Part{}, d.Capacitors...), d.Resistors...) {
			if !(p.Value > 0) || math.IsInf(p.Value, 0) || !(p.Tol >= 0 && p.Tol < 1) || !(p.Measured >= 0) {
				t.Errorf("accepted %+v", p)
			}
		}
	})
}
