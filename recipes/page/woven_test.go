package page_test

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"ringbook/recipes/page"
)

// ladderPage is the woven recipe of recipe_test.go.
func ladderPage(t testing.TB, rings ...float64) (*page.Page, error) {
	t.Helper()
	p := page.New("Ladder on winch-drive B, revision C")
	err := p.Run(func() error { return ladder(p, rings) })
	p.Foot(page.Foot{Scope: "winch-drive B, since 2031-03-01", Digest: "9f86d081884c7d659a2feaa0c55ad015a3bf4f1b2b0b822cd15d6c15b0f00a08",
		Version: "ringbook 0.0.0"})
	return p, err
}

// outputs are all the ways to write a page, by the ending of a file's name.
var outputs = map[string]func(*page.Page, *bytes.Buffer) error{
	"html":     func(p *page.Page, b *bytes.Buffer) error { return p.HTML(b) },
	"md":       func(p *page.Page, b *bytes.Buffer) error { return p.Markdown(b, page.MarkdownOptions{}) },
	"tex":      func(p *page.Page, b *bytes.Buffer) error { return p.LaTeX(b, page.LaTeXOptions{}) },
	"csv":      func(p *page.Page, b *bytes.Buffer) error { return p.CSV(b) },
	"txt":      func(p *page.Page, b *bytes.Buffer) error { return p.Text(b, page.TextOptions{Prose: true}) },
	"code.txt": func(p *page.Page, b *bytes.Buffer) error { return p.Text(b, page.TextOptions{Code: true}) },
}

// write renders a page as one output.
func write(t testing.TB, p *page.Page, output string) string {
	t.Helper()
	var b bytes.Buffer
	if err := outputs[output](p, &b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestWovenGolden(t *testing.T) {
	here, err := os.Getwd()
	if err != nil {
		t.Fatal(err)
	}
	for output := range outputs {
		for name, rings := range map[string][]float64{"woven": {38e6, 31.02e6, 28.3e6, 16.4e6}, "stopped": nil} {
			t.Run(name+"."+output, func(t *testing.T) {
				p, err := ladderPage(t, rings...)
				if (err != nil) != (rings == nil) {
					t.Fatal(err)
				}
				got := write(t, p, output)
				again, _ := ladderPage(t, rings...)
				if got != write(t, p, output) || got != write(t, again, output) {
					t.Error("twice the same gives different bytes")
				}
				if strings.Contains(got, here) || strings.Contains(got, "ringbook/recipes") {
					t.Error("a path of the machine is on the page")
				}
				file := filepath.Join("testdata", name+".golden."+output)
				if *update {
					if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
						t.Fatal(err)
					}
				}
				want, err := os.ReadFile(file)
				if err != nil {
					t.Fatal(err)
				}
				if diff := cmp.Diff(string(want), got); diff != "" {
					t.Errorf("differs from %s (-want +got); look, and run with -update if it is right:\n%s", file, diff)
				}
			})
		}
	}
}
