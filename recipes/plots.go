package recipes

import (
	"context"
	"fmt"
	"math"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/snubber/waveform"
)

// linePlot is the substitution line with its band, and what the trials leave of it below.
func linePlot(line *snubber.SubstitutionLine) *page.Plot {
	square := func(name, csv string) page.Axis {
		return page.LinearAxis(name, quantity.Ratio, csv).In("ns²", 1e18)
	}
	p := page.NewPlot("The substitution line: its slope is the loop's inductance, and it meets zero at minus the loop's capacitance",
		page.LinearAxis("capacitance across the node, the probe's with it", quantity.Capacitance, "added_f"), square("1/(2πf)²", "inverse_square_s2"))
	var c, y, u, rest []float64
	most := 0.0
	for _, x := range line.Points {
		c, y, u, rest = append(c, x.AddedC), append(y, x.Inverse), append(u, math.Hypot(x.InverseU, line.Slope*x.AddedU)), append(rest, x.Residual)
		most = math.Max(most, x.AddedC)
	}
	zero := -line.Intercept / line.Slope
	var cs, mid, low, high []float64
	for i := range 61 {
		x := zero + (1.05*most-zero)*float64(i)/60
		v, s := line.At(x)
		cs, mid, low, high = append(cs, x), append(mid, v), append(low, v-1.96*s), append(high, v+1.96*s)
	}
	p.Points("trials", c, y).K1(u)
	p.Line("fitted line", cs, mid)
	p.Band("95 % band of the line", cs, low, high)
	r := p.Below(square("residual", "residual_s2"))
	r.Points("trials", c, rest).K1(u)
	r.Across("", 0)
	return p
}

// frontPlot is loss against the peak at worst: what less overshoot costs.
func frontPlot(rec *snubber.Recommendation) *page.Plot {
	p := page.NewPlot("What a lower peak costs",
		page.LinearAxis("peak at worst", quantity.Voltage, "worst_v"), page.LinearAxis("loss", quantity.Power, "loss_w"))
	all := append([]snubber.Choice{*rec.Choice}, rec.Alternatives...)
	var peak, loss []float64
	for _, x := range all {
		peak, loss = append(peak, x.WorstV), append(loss, x.LossW)
	}
	p.Line("least loss for each peak", peak, loss)
	p.Points("rule of thumb", []float64{rec.RuleOfThumb.WorstV}, []float64{rec.RuleOfThumb.LossW})
	p.Points("bare node", []float64{rec.Bare.WorstV}, []float64{rec.Bare.LossW})
	p.Mark("choice", rec.Choice.WorstV, rec.Choice.LossW)
	p.Upright("limit", rec.LimitV)
	return p
}

// predicted is the node's voltage from the closed form, at the times given, s after the switch lets go; nil where the circuit
// has none.
func predicted(l snubber.Loop, n snubber.Network, e snubber.Excitation, at []float64) []float64 {
	var node func(t float64) float64
	if n.Kind == snubber.RCD {
		turn, err := snubber.TurnOff(l, n, e)
		if err != nil {
			return nil
		}
		node = turn.NodeAt
	} else {
		r, err := snubber.Respond(l, n, e)
		if err != nil {
			return nil
		}
		node = r.NodeAt
	}
	v := make([]float64, len(at))
	for i, t := range at {
		if t >= 0 {
			v[i] = node(t)
		}
	}
	return v
}

// spread is n times from a to b.
func spread(a, b float64, n int) []float64 {
	at := make([]float64, n)
	for i := range at {
		at[i] = a + (b-a)*float64(i)/float64(n-1)
	}
	return at
}

// ringTime is how long the loop's ring is shown, s: some eight cycles.
func ringTime(l snubber.Loop) float64 {
	return 8 * 2 * math.Pi * math.Sqrt(l.Inductance*l.Capacitance)
}

// withAndWithoutPlot is the node's voltage as computed, bare and with the choice.
func withAndWithoutPlot(rec *snubber.Recommendation, n snubber.Network) *page.Plot {
	p := page.NewPlot("The node after the switch lets go, computed",
		page.LinearAxis("time", quantity.Time, "time_s"), page.LinearAxis("voltage across the switch", quantity.Voltage, "switch_v"))
	at := spread(0, ringTime(rec.Loop), 1200)
	p.Line("bare", at, predicted(rec.Loop, snubber.Network{Kind: snubber.Bare}, rec.Excitation, at))
	p.Line("with "+rec.Choice.InWords(), at, predicted(rec.Loop, n, rec.Excitation, at))
	p.Across("limit", rec.LimitV)
	return p
}

// networkPlot is peak and loss over R and C with the choice marked.
func networkPlot(ctx context.Context, rec *snubber.Recommendation) (*page.Plot, error) {
	p := page.NewPlot("Peak and loss over the network",
		page.LogAxis("resistance R", quantity.Resistance, "r_ohm"), page.LogAxis("capacitance C", quantity.Capacitance, "c_f"))
	const n = 81
	z, c0 := rec.Loop.Impedance(), math.Min(rec.Choice.C, rec.Loop.Capacitance)
	rs, cs := make([]float64, n), make([]float64, n)
	for i := range n {
		rs[i] = 0.15 * z * math.Pow(60, float64(i)/(n-1))
		cs[i] = 0.4 * c0 * math.Pow(40, float64(i)/(n-1))
	}
	g, err := snubber.Sweep(ctx, rec.Loop, rec.Excitation, rec.SwitchingHz, cs, rs)
	if err != nil {
		return nil, err
	}
	across := func(rows [][]float64) [][]float64 {
		out := make([][]float64, n)
		for i := range out {
			out[i] = make([]float64, n)
			for j := range out[i] {
				out[i][j] = rows[j][i]
			}
		}
		return out
	}
	peak := across(g.Peak)
	p.Contours(page.LinearAxis("peak", quantity.Voltage, "peak_v"), rs, cs, peak)
	p.Contours(page.LogAxis("loss", quantity.Power, "loss_w"), rs, cs, across(g.Loss))
	if !round10(rec.LimitV) { // where it is a round number it is among the contours of the peak
		p.Contours(page.LinearAxis("limit of the peak", quantity.Voltage, "peak_v"), rs, cs, peak).Levels(rec.LimitV)
	}
	p.Mark("choice", rec.Choice.R, rec.Choice.C)
	return p, nil
}

// overlayPlot is a captured waveform and the predicted one over it, both from the edge on.
func overlayPlot(title string, c *Captured, l snubber.Loop, n snubber.Network, e snubber.Excitation, limit float64) *page.Plot {
	p := page.NewPlot(title,
		page.LinearAxis("time after the edge", quantity.Time, "time_s"), page.LinearAxis("voltage across the switch", quantity.Voltage, "switch_v"))
	end := ringTime(l)
	var at, v []float64
	for i, x := range c.Record.Volts {
		if t := c.Record.TimeAt(i) - c.EdgeS; t >= -0.15*end && t <= end {
			at, v = append(at, t), append(v, x)
		}
	}
	p.Line("measured", at, v)
	// The edge is where the node passes half way; the prediction is put so that its own passes there too.
	fine := spread(0, end, 4000)
	w := predicted(l, n, e, fine)
	shift := 0.0
	for i := range w {
		if w[i] >= e.Bus/2 {
			shift = fine[i]
			break
		}
	}
	for i := range fine {
		fine[i] -= shift
	}
	if w != nil {
		p.Line("predicted", fine, w)
	}
	p.Across("limit", limit)
	return p
}

// spectrumPlot is the spectrum before and after.
func spectrumPlot(before, after *Captured, withWhat string) *page.Plot {
	p := page.NewPlot(fmt.Sprintf("Amplitude spectrum, %v window over the whole record", before.Spectrum.Window),
		page.LogAxis("frequency", quantity.Frequency, "frequency_hz"), page.LinearAxis("level", quantity.Ratio, "level_dbuv").In("dB(µV)", 1))
	for _, x := range []struct {
		name string
		c    *Captured
	}{{"bare", before}, {"with " + withWhat, after}} {
		var hz, level []float64
		s := x.c.Spectrum
		for k := 1; k < len(s.Volts); k++ {
			if f := float64(k) * s.StepHz; before.RingHz == nil || f <= 6*before.RingHz.Value {
				hz, level = append(hz, f), append(level, waveform.DBuV(s.Volts[k]))
			}
		}
		p.Line(x.name, hz, level)
	}
	if before.Line != nil {
		p.Upright("bare ring "+quantity.Format(before.Line.Hz, quantity.Frequency, 3), before.Line.Hz)
	}
	return p
}

// round10 says whether v is a multiple of ten, in its own power of ten.
func round10(v float64) bool {
	unit := math.Pow(10, math.Floor(math.Log10(v)))
	return math.Abs(v/unit-math.Round(v/unit)) < 1e-9
}
