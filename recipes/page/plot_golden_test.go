package page_test

import (
	"bytes"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ringbook/recipes/page"
	"ringbook/snubber/quantity"
)

// The SVG of a plot is the same to the byte on every machine and each time.
func TestPlotGolden(t *testing.T) {
	plots := gallery()
	for _, name := range []string{"substitution", "contours", "revisions", "looks", "empty"} {
		got, err := plots[name].SVG()
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		again, err := gallery()[name].SVG()
		if err != nil || !bytes.Equal(got, again) {
			t.Errorf("%s: drawing twice gives different bytes (err %v)", name, err)
		}
		file := filepath.Join("testdata", "plot-"+name+".golden.svg")
		if *update {
			if err := os.WriteFile(file, got, 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(got, want) {
			t.Errorf("%s differs from %s; look at it (-plots DIR), and run with -update if it is right", name, file)
		}
	}
}

func ExampleNewPlot() {
	p := page.NewPlot("Ring of winch-drive B against the added capacitor",
		page.LinearAxis("added C", quantity.Capacitance, "added_f"),
		page.LinearAxis("ring frequency", quantity.Frequency, "ring_hz"))
	added := []float64{0, 470e-12, 1e-9}
	p.Points("trials", added, []float64{41.6e6, 28.3e6, 22.3e6}).K1([]float64{0.2e6, 0.2e6, 0.1e6})
	p.Line("fit", added, []float64{41.5e6, 28.3e6, 22.3e6})
	p.Across("wanted", 30e6)
	fmt.Println(strings.ReplaceAll(p.Alt(), "\u00a0", " "))
	// Output:
	// Ring of winch-drive B against the added capacitor: ring frequency against added C; trials (3 points, bars: k = 1), added C 0 F to 1 nF, ring frequency 22.3 MHz to 41.6 MHz; fit (line), added C 0 F to 1 nF, ring frequency 22.3 MHz to 41.5 MHz; wanted drawn at ring frequency 30 MHz.
}

// The five plots of a page, as SVG; and a waveform of a million samples.
func BenchmarkFivePlots(b *testing.B) {
	plots := []*page.Plot{substitutionPlot(), waveformPlot(2000), contourPlot(), spectrumPlot(), revisionPlot()}
	b.ReportAllocs()
	for b.Loop() {
		for _, p := range plots {
			if _, err := p.SVG(); err != nil {
				b.Fatal(err)
			}
		}
	}
}

func BenchmarkMillionSamples(b *testing.B) {
	p := waveformPlot(1_000_000)
	b.ReportAllocs()
	for b.Loop() {
		if _, err := p.SVG(); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkPlotPNG(b *testing.B) {
	p := substitutionPlot()
	for b.Loop() {
		if err := p.PNG(io.Discard, 300); err != nil {
			b.Fatal(err)
		}
	}
}
