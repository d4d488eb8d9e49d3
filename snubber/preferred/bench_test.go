package preferred_test

import (
	"testing"

	. "ringbook/snubber/preferred"
)

func BenchmarkNearest(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		if _, err := E24.Nearest(5.1e-10); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkBetween(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		if _, err := E192.Between(1, 1e6); err != nil {
			b.Fatal(err)
		}
	}
}
