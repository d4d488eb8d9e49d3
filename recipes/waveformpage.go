package recipes

import (
	_ "embed"
	"fmt"
	"math"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/snubber/waveform"
)

//go:embed waveformpage.go
var waveformSource string

// Waveform is the page of a captured edge: the ring after it, the peak, and the spectrum, read from the samples.
func Waveform(p *page.Page, c *Captured) {
	p.Weave(waveformSource)

	// ## What the samples show
	//
	// A damped sinusoid is fitted to the samples after the edge, v = V + A exp(-t/τ) cos(2πft + φ), by least squares; the
	// uncertainties are from what the fit leaves. A ring is reported only where it stands out of the noise.
	sayCaptured(p, c)

	// ## The capture
	//
	// The samples, and over them the fitted curve where it was fitted.
	p.Plot(capturePlot(c))

	// ## The spectrum
	//
	// The amplitude spectrum of the whole record, as the rms value of the sinusoid that would give each line.
	if len(c.Spectrum.Volts) > 1 {
		p.Plot(lineSpectrumPlot(c))
	}
}

// capturePlot is the samples and the fitted curve.
func capturePlot(c *Captured) *page.Plot {
	p := page.NewPlot("The captured edge", page.LinearAxis("time", quantity.Time, "time_s"), page.LinearAxis("voltage", quantity.Voltage, "volts"))
	var at []float64
	for i := range c.Record.Volts {
		at = append(at, c.Record.TimeAt(i))
	}
	p.Line("samples", at, c.Record.Volts)
	if c.FitTo > c.FitFrom {
		fine := spread(c.FitFrom, c.FitTo, 4000)
		v := make([]float64, len(fine))
		for i, t := range fine {
			v[i], _ = c.Fitted(t)
		}
		p.Line("fitted", fine, v)
	}
	return p
}

// lineSpectrumPlot is the spectrum with the ring's line marked.
func lineSpectrumPlot(c *Captured) *page.Plot {
	p := page.NewPlot(fmt.Sprintf("Amplitude spectrum, %v window", c.Spectrum.Window),
		page.LogAxis("frequency", quantity.Frequency, "frequency_hz"), page.LinearAxis("level", quantity.Ratio, "level_dbuv").In("dB(µV)", 1))
	var hz, level []float64
	for k := 1; k < len(c.Spectrum.Volts); k++ {
		hz, level = append(hz, float64(k)*c.Spectrum.StepHz), append(level, waveform.DBuV(c.Spectrum.Volts[k]))
	}
	p.Line("spectrum", hz, level)
	if c.Line != nil {
		p.Upright("ring "+quantity.Format(c.Line.Hz, quantity.Frequency, 3), c.Line.Hz)
	}
	return p
}

// sayCaptured puts on a page what a captured edge shows.
func sayCaptured(p *page.Page, c *Captured) {
	span := float64(c.Samples) * c.Interval
	what := fmt.Sprintf("%d samples, %s apart, %s in all", c.Samples, quantity.Format(c.Interval, quantity.Time, 3), quantity.Format(span, quantity.Time, 3))
	if c.Captures > 1 {
		what = fmt.Sprintf("the mean of %d captures: ", c.Captures) + what
	}
	p.Say("%s.", upper(what))
	edge := "falling"
	if c.Rising {
		edge = "rising"
	}
	if !c.Ringing {
		p.Say("**No ring stands out of the noise.**")
	}
	remark := ""
	if c.PeakV != nil && math.Abs(c.PeakFitV-c.PeakSampleV) > 3*math.Max(c.PeakV.U, c.NoiseV) {
		remark = fmt.Sprintf("by the curve; the highest sample is %s", quantity.Format(c.PeakSampleV, quantity.Voltage, 4))
	}
	figures := []page.Figure{
		{Name: "ring frequency, as seen", CSV: "ring_hz", Unit: quantity.Frequency, Value: estimated(c.RingHz)},
		{Name: "decay, 1/e", CSV: "decay_s", Unit: quantity.Time, Value: estimated(c.DecayS)},
		{Name: "damping ratio", CSV: "damping_ratio", Unit: quantity.Ratio, Value: estimated(c.DampingRatio)},
		{Name: "peak", CSV: "peak_v", Unit: quantity.Voltage, Value: estimated(c.PeakV), Remark: remark},
		{Name: "settled", CSV: "settled_v", Unit: quantity.Voltage, Value: estimated(c.SettledV)},
		{Name: "edge at", CSV: "edge_s", Unit: quantity.Time, Value: c.EdgeS, Remark: edge},
	}
	if c.Ringing {
		figures = append(figures, page.Figure{Name: "ring over noise", CSV: "snr_db", Value: fmt.Sprintf("%.1f dB", c.SNRdB), Remark: "amplitude squared over twice the noise's variance"})
	}
	if s := c.Second; s != nil {
		figures = append(figures, page.Figure{Name: "second ring", CSV: "second_hz", Unit: quantity.Frequency, Value: estimated(&s.Hz),
			Remark: fmt.Sprintf("%s of %s", quantity.Format(s.AmplitudeV, quantity.Voltage, 3), quantity.Format(c.AmplitudeV, quantity.Voltage, 3))})
	}
	if c.Line != nil {
		figures = append(figures, page.Figure{Name: "its line in the spectrum", CSV: "line_v", Unit: quantity.Voltage, Value: c.Line.V,
			Remark: fmt.Sprintf("%.1f dB(µV) rms at %s, %v window over the whole record", c.Line.DBuV, quantity.Format(c.Line.Hz, quantity.Frequency, 4), c.Spectrum.Window)})
	}
	p.Figures(figures...)
	if x := c.Change; x != nil {
		p.Say("At %s the spectrum lies %.1f dB %s that of %s.", quantity.Format(x.Hz, quantity.Frequency, 4), math.Abs(x.DB), map[bool]string{true: "below", false: "above"}[x.DB < 0], x.Origin)
	}
	for _, w := range c.Warnings {
		p.Warn("%s.", w)
	}
}

// estimated is a waveform's figure as a table's cell.
func estimated(f *waveform.Figure) any {
	if f == nil {
		return nil
	}
	return snubber.Estimate{Value: f.Value, U: f.U, Low: f.Low, High: f.High}
}
