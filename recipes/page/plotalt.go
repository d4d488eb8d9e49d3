package page

import (
	"fmt"
	"strings"
)

// Alt says in one sentence what the plot shows, for readers who do not see it: title, axes, the series with their
// ranges, reference lines and marks. Of a plot with a mistake it says the mistake.
func (p *Plot) Alt() string {
	if err := p.check(); err != nil {
		return err.Error()
	}
	var b strings.Builder
	if p.title != "" {
		b.WriteString(p.title + ": ")
	}
	for i, q := range p.panels() {
		if i > 0 {
			b.WriteString("; below, ")
		}
		b.WriteString(q.y.name + " against " + p.x.name)
		if !q.anyData() {
			b.WriteString("; no data")
		}
		for _, l := range q.layers {
			if s := l.describe(p.x, q.y); s != "" {
				b.WriteString("; " + s)
			}
		}
	}
	b.WriteString(".")
	return b.String()
}

// ranges says "x low to high, y low to high".
func ranges(xAxis, yAxis Axis, x, y []float64) string {
	var xr, yr reach
	seePairs(&xr, &yr, x, y)
	if !xr.any || !yr.any {
		return "no data"
	}
	return xAxis.name + " " + xAxis.span(xr) + ", " + yAxis.name + " " + yAxis.span(yr)
}

// span is "low to high", or one value where they are alike.
func (a Axis) span(r reach) string {
	low, high := a.text(r.low), a.text(r.high)
	if low == high {
		return low
	}
	return low + " to " + high
}

// called is a series' name in a clause.
func (s *Series) called(kind string) string {
	if s.name == "" {
		return kind
	}
	return s.name
}

func (l *lineLayer) describe(x, y Axis) string {
	return l.called("a line") + " (line), " + ranges(x, y, l.x, l.y)
}

func (s *Points) describe(x, y Axis) string {
	n := 0
	for i, v := range s.y {
		if plottable(v) && (s.x == nil || plottable(s.x[i])) {
			n++
		}
	}
	what := fmt.Sprintf("%d points", n)
	if n == 1 {
		what = "1 point"
	}
	if s.bars != "" {
		what += ", bars: " + s.bars
	}
	if x.scale == category && len(s.y) <= 12 && n > 0 { // few enough to be told
		var values []string
		for i, at := range x.at(s.x, len(s.y)) {
			if plottable(s.y[i]) && plottable(at) {
				t := x.text(at) + ": " + y.text(s.y[i])
				if s.bars != "" {
					t += " (" + y.text(s.low[i]) + " to " + y.text(s.high[i]) + ")"
				}
				values = append(values, t)
			}
		}
		return s.called("points") + " (" + what + "), " + strings.Join(values, ", ")
	}
	return s.called("points") + " (" + what + "), " + ranges(x, y, s.x, s.y)
}

func (l *bandLayer) describe(x, y Axis) string {
	ys := append(append([]float64(nil), l.low...), l.high...)
	xs := l.x
	if xs != nil {
		xs = append(append([]float64(nil), l.x...), l.x...)
	}
	return l.called("a band") + " (band), " + ranges(x, y, xs, ys)
}

func (s *Contours) describe(x, y Axis) string {
	r := s.reach()
	if !r.any {
		return s.called("contours") + " (contours), no data"
	}
	at := ""
	for i, l := range s.chosen() {
		if i == 0 {
			at = ", lines at "
		} else {
			at += ", "
		}
		at += l.label
	}
	return s.called("contours") + " (contours), " + s.z.span(r) + at
}

func (m *markLayer) describe(x, y Axis) string {
	if !plottable(m.x) || !plottable(m.y) {
		return ""
	}
	return fmt.Sprintf("%s marked at %s %s, %s %s", m.called("a point"), x.name, x.text(m.x), y.name, y.text(m.y))
}

func (r *ruleLayer) describe(x, y Axis) string {
	a := y
	if r.upright {
		a = x
	}
	if !plottable(r.at) {
		return ""
	}
	return fmt.Sprintf("%s drawn at %s %s", r.called("a line"), a.name, a.text(r.at))
}
