package leastsq

import (
	"testing"
)

func benchmarkFit(b *testing.B, pr Problem) {
	b.ReportAllocs()
	for b.Loop() {
		res, err := Fit(b.Context(), pr, Options{})
		if err != nil || res.Status != Converged {
			b.Fatal(err, res)
		}
	}
}

func BenchmarkFit(b *testing.B) {
	for _, how := range []struct {
		name     string
		analytic bool
	}{{"analytic", true}, {"differences", false}} {
		for _, name := range []string{"Misra1a", "MGH09"} {
			b.Run(name+"/"+how.name, func(b *testing.B) {
				y, x := readSet(b, name)
				benchmarkFit(b, strdModels[name].problem(b, x[0], y, readStarts(b, name)[1], how.analytic))
			})
		}
		b.Run("ring/"+how.name, func(b *testing.B) {
			benchmarkFit(b, ringProblem(b, 25, 4e-9, 0.01, []float64{1, 1e7, 20e6, 0.3, 0.1}, []float64{0.8, 0.5e7, 21e6, 0, 0}, how.analytic))
		})
	}
}

func BenchmarkLinear(b *testing.B) {
	y, x := readSet(b, "Longley")
	design := columns(true, x)
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Linear(design, y, nil); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkLine(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Line(pearsonX, pearsonY, pearsonUX, pearsonUY, nil); err != nil {
			b.Fatal(err)
		}
	}
}
