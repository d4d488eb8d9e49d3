package page_test

import (
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// The plots that recipes need, from made-up data of an invented board: loop of 36.2 nH, 405 pF and 0.6 ohm.
const (
	loopL = 36.2e-9
	loopC = 405e-12
	loopR = 0.6
)

// substitutionPlot is the line of a capacitor-substitution series with its band and residuals.
func substitutionPlot() *page.Plot {
	rng := rand.New(rand.NewPCG(1, 2))
	p := page.NewPlot("Substitution on winch-drive B, revision C",
		page.LinearAxis("added capacitance", quantity.Capacitance, "added_f"),
		page.LinearAxis("1/(2πf)²", quantity.Ratio, "inverse_square_s2").In("ns²", 1e18))
	var c, y, u, residual, line, low, high, cs []float64
	for _, added := range []float64{0, 100e-12, 220e-12, 470e-12, 1e-9, 1.5e-9, 2.2e-9} {
		v := loopL * (loopC + added)
		s := 0.012 * v
		d := s * rng.NormFloat64()
		c, y, u, residual = append(c, added), append(y, v+d), append(u, s), append(residual, d)
	}
	for i := range 60 {
		x := -loopC + float64(i)/59*(2.4e-9+loopC)
		v := loopL * (loopC + x)
		h := math.Hypot(1.2e-18, 0.02*v)
		cs, line, low, high = append(cs, x), append(line, v), append(low, v-h), append(high, v+h)
	}
	p.Points("trials", c, y).K1(u)
	p.Line("fitted line", cs, line)
	p.Band("95 % band of the line", cs, low, high)
	r := p.Below(page.LinearAxis("residual", quantity.Ratio, "residual_s2").In("ns²", 1e18))
	r.Points("trials", c, residual).K1(u)
	r.Across("", 0)
	return p
}

// ring is the voltage of the loop's series L, R, C after the switch lets go, with a damping ratio.
func ring(t, f, zeta, bus, overshoot float64) float64 {
	if t < 0 {
		return 0
	}
	w := 2 * math.Pi * f
	return bus * (1 - (1+overshoot/bus)*math.Exp(-zeta*w*t)*math.Cos(w*math.Sqrt(1-zeta*zeta)*t))
}

// waveformPlot is a measured waveform and the predicted one over it.
func waveformPlot(samples int) *page.Plot {
	rng := rand.New(rand.NewPCG(3, 4))
	p := page.NewPlot("Switch voltage with 10R + 1n5 on winch-drive B, revision C",
		page.LinearAxis("time after switching", quantity.Time, "time_s"),
		page.LinearAxis("voltage across the switch", quantity.Voltage, "switch_v"))
	var t, measured, predicted []float64
	for i := range samples {
		x := -40e-9 + 640e-9*float64(i)/float64(samples-1)
		t = append(t, x)
		measured = append(measured, ring(x, 30.1e6, 0.09, 48, 6)+0.4*rng.NormFloat64())
		predicted = append(predicted, ring(x, 30.4e6, 0.1, 48, 4))
	}
	p.Line("measured", t, measured)
	p.Line("predicted", t, predicted)
	p.Across("limit 100 V", 100)
	p.Across("bus 48 V", 48)
	return p
}

// contourPlot is peak and loss over R and C with the choice marked.
func contourPlot() *page.Plot {
	p := page.NewPlot("Peak and loss over the network, winch-drive B at 48 V and 12 A",
		page.LogAxis("snubber resistance", quantity.Resistance, "r_ohm"),
		page.LogAxis("snubber capacitance", quantity.Capacitance, "c_f"))
	var r, c []float64
	for i := range 81 {
		r = append(r, math.Pow(10, 2*float64(i)/80))
		c = append(c, 100e-12*math.Pow(10, 2*float64(i)/80))
	}
	peak, loss := make([][]float64, len(r)), make([][]float64, len(r))
	z0 := math.Sqrt(loopL / loopC)
	for i := range r {
		for j := range c {
			k := c[j] / loopC
			best := z0 * math.Sqrt(1+1/k)
			off := math.Log(r[i]/best) / 0.9
			zeta := 0.03 + 0.35*k/(1+k)*math.Exp(-off*off/2)
			peak[i] = append(peak[i], 48+70*math.Exp(-math.Pi*zeta/math.Sqrt(1-zeta*zeta)))
			loss[i] = append(loss[i], c[j]*48*48*200e3)
		}
	}
	p.Contours(page.LinearAxis("peak", quantity.Voltage, "peak_v"), r, c, peak)
	p.Contours(page.LogAxis("loss", quantity.Power, "loss_w"), r, c, loss)
	p.Contours(page.LinearAxis("limit of the peak", quantity.Voltage, "peak_v"), r, c, peak).Levels(85)
	p.Mark("choice: 10R + 1n5", 10, 1.5e-9)
	return p
}

// spectrumPlot is the spectrum of the switch voltage before and after.
func spectrumPlot() *page.Plot {
	rng := rand.New(rand.NewPCG(5, 6))
	p := page.NewPlot("Spectrum of the switch voltage, winch-drive B",
		page.LogAxis("frequency", quantity.Frequency, "frequency_hz"),
		page.LinearAxis("level", quantity.Ratio, "level_dbuv").In("dB(µV)", 1))
	var f, before, after []float64
	for i := range 2000 {
		x := 150e3 * math.Pow(300e6/150e3, float64(i)/1999)
		f = append(f, x)
		envelope := 132 - 20*math.Log10(x/150e3) - 10*math.Log10(1+math.Pow(x/12e6, 2))
		peak := func(f0, q float64) float64 {
			return 10 * math.Log10(1+q*q/(1+math.Pow(2*q*(x/f0-1), 2)))
		}
		before = append(before, envelope+peak(41.6e6, 14)+1.5*rng.NormFloat64())
		after = append(after, envelope+peak(30e6, 1.6)+1.5*rng.NormFloat64())
	}
	p.Line("before: bare", f, before)
	p.Line("after: 10R + 1n5", f, after)
	p.Upright("ring 41.6 MHz", 41.6e6)
	return p
}

// revisionPlot is the loop's L and C by revision.
func revisionPlot() *page.Plot {
	p := page.NewPlot("Loop of winch-drive by revision",
		page.CategoryAxis("revision", "revision", "A", "B", "C", "C, second sample", "D"),
		page.LinearAxis("inductance L", quantity.Inductance, "inductance_h"))
	e := func(v, u float64) snubber.Estimate {
		return snubber.Estimate{Value: v, U: u, Low: v - 1.96*u, High: v + 1.96*u}
	}
	p.Estimates("L", nil, []snubber.Estimate{e(52.1e-9, 1.1e-9), e(44.8e-9, 0.7e-9), e(36.2e-9, 0.4e-9), e(36.9e-9, 0.9e-9), e(28.4e-9, 0.5e-9)})
	c := p.Below(page.LinearAxis("capacitance C", quantity.Capacitance, "capacitance_f"))
	c.Estimates("C", nil, []snubber.Estimate{e(398e-12, 11e-12), e(401e-12, 9e-12), e(405e-12, 7e-12), e(411e-12, 12e-12), e(463e-12, 8e-12)}).Style(1)
	return p
}

func gallery() map[string]*page.Plot {
	empty := page.NewPlot("Nothing read yet", page.LinearAxis("added capacitance", quantity.Capacitance, "added_f"),
		page.LinearAxis("ring frequency", quantity.Frequency, "ring_hz"))
	empty.Points("trials", []float64{}, nil)
	many := page.NewPlot("Scatter", page.LinearAxis("x", quantity.Ratio, "x"), page.LinearAxis("y", quantity.Voltage, "y_v"))
	rng := rand.New(rand.NewPCG(7, 8))
	var x, y []float64
	for range 100000 {
		x, y = append(x, rng.NormFloat64()), append(y, 1e-3*rng.NormFloat64())
	}
	many.Points("draws", x, y)
	all := page.NewPlot("Every look", page.LinearAxis("x", quantity.Time, "x_s"), page.LinearAxis("y", quantity.Current, "y_a"))
	for i := range 7 {
		xs, ys := []float64{0, 1e-6, 2e-6, 3e-6}, []float64{float64(i), float64(i) + 1, float64(i) + 0.5, float64(i) + 1.5}
		all.Line(fmt.Sprintf("line %d", i), xs, ys).Style(i)
		all.Points(fmt.Sprintf("points %d", i), xs, ys).Style(i)
	}
	crowded := page.NewPlot("Crowded", page.CategoryAxis("session at the bench, with a long name that goes on and on and on and on and on and on and on and on", "session",
		strings.Split(strings.Repeat("first sitting,second,a third one with a long name,", 12)+"last", ",")...),
		page.LogAxis("a long name for the node's quality factor, which does not fit beside so low a figure", quantity.Ratio, "q"))
	for k := range 3 {
		var v, low, high []float64
		for i := range 37 {
			v = append(v, math.Pow(10, 3*rng.Float64()))
			low, high = append(low, v[i]*(rng.Float64()-0.2)), append(high, v[i]*(1+rng.Float64()))
		}
		crowded.Points(fmt.Sprintf("sample %d of a board with a long name, measured with the long probe", k), nil, v).Interval95(low, high)
	}
	crowded.Across("a limit with a long name", 300)
	one := page.NewPlot("One point", page.LinearAxis("added capacitance", quantity.Capacitance, "added_f"),
		page.LogAxis("ring frequency", quantity.Frequency, "ring_hz"))
	one.Points("trial", []float64{470e-12}, []float64{30.1e6}).K1([]float64{0.2e6})
	one.Mark("the only one", 470e-12, 30.1e6)
	return map[string]*page.Plot{
		"crowded": crowded, "one": one,
		"substitution": substitutionPlot(), "waveforms": waveformPlot(2000), "contours": contourPlot(),
		"spectrum": spectrumPlot(), "revisions": revisionPlot(), "empty": empty, "many": many, "looks": all,
		"million": waveformPlot(1_000_000),
	}
}

var plots = flag.String("plots", "", "write the gallery of plots as SVG and PNG into this folder, to look at")

func TestGallery(t *testing.T) {
	for name, p := range gallery() {
		svg, err := p.SVG()
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if len(svg) > 300_000 {
			t.Errorf("%s: %d bytes of SVG, more than 300,000", name, len(svg))
		}
		if *plots == "" {
			continue
		}
		t.Logf("%s: %d bytes: %s", name, len(svg), p.Alt())
		if err := os.WriteFile(filepath.Join(*plots, name+".svg"), svg, 0o644); err != nil {
			t.Fatal(err)
		}
		f, err := os.Create(filepath.Join(*plots, name+".png"))
		if err != nil {
			t.Fatal(err)
		}
		if err := p.PNG(f, 150); err != nil {
			t.Error(err)
		}
		if err := f.Close(); err != nil {
			t.Error(err)
		}
	}
}
