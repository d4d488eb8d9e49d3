package page_test

import (
	_ "embed"
	"fmt"
	"io"
	"testing"
	"time"

	"ringbook/recipes/page"
	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// historyPage is a page of n trials as the history recipe makes it.
func historyPage(n int) *page.Page {
	t := page.NewTable("History",
		page.Label("trial", "trial"), page.Instant("read", "at"), page.Label("board", "board"),
		page.Part("C", quantity.Capacitance, "c"), page.Measured("ring", quantity.Frequency, "ring_hz"),
		page.Measured("peak", quantity.Voltage, "peak_v"), page.Words("note", "note"))
	day := time.Date(2031, 3, 14, 9, 30, 0, 0, time.UTC)
	for i := range n {
		r := t.Row(fmt.Sprintf("T-%06d", i), day.Add(time.Duration(i)*time.Minute), "winch-drive B", 470e-12,
			snubber.Estimate{Value: 28.3e6 + float64(i), U: 40e3}, snubber.Reading{Value: 88, U: 0.5},
			"read again after fixing the ground spring")
		if i%10 == 0 {
			r.Note("The decay was not read; lengthen the record.")
		}
	}
	p := page.New("History of winch-drive B")
	p.Table(t)
	return p
}

func BenchmarkPage(b *testing.B) {
	for _, n := range []int{1000, 100000} {
		for _, o := range []struct {
			name   string
			render func(*page.Page) error
		}{
			{"text", func(p *page.Page) error { return p.Text(io.Discard, page.TextOptions{}) }},
			{"markdown", func(p *page.Page) error { return p.Markdown(io.Discard, page.MarkdownOptions{}) }},
			{"html", func(p *page.Page) error { return p.HTML(io.Discard) }},
			{"latex", func(p *page.Page) error { return p.LaTeX(io.Discard, page.LaTeXOptions{}) }},
			{"csv", func(p *page.Page) error { return p.CSV(io.Discard) }},
		} {
			b.Run(fmt.Sprintf("%s/%d", o.name, n), func(b *testing.B) {
				b.ReportAllocs()
				for b.Loop() {
					if err := o.render(historyPage(n)); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}

// A woven page whose recipe says 10,000 things: each is brought to its place.
func BenchmarkWeave(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		p := page.New("Said")
		talkative(p, 10000)
		if err := p.HTML(io.Discard); err != nil {
			b.Fatal(err)
		}
	}
}

func talkative(p *page.Page, n int) {
	p.Weave(benchSource)
	for i := range n {
		p.Say("said %d", i)
	}
}

//go:embed bench_test.go
var benchSource string
