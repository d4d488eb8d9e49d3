package quantity_test

import (
	"testing"

	. "ringbook/snubber/quantity"
)

func BenchmarkParse(b *testing.B) {
	for _, s := range []string{"4.7e-10", "470 pF", "2n2"} {
		b.Run(s, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, err := Parse(s, Capacitance); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkFormat(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		Format(1.2345e-8, Inductance, 3)
	}
}

func BenchmarkFormatUncertain(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		FormatUncertain(1.2345e-8, 1.1e-10, Inductance)
	}
}
