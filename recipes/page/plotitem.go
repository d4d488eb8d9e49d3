package page

import (
	"bytes"
	"errors"
	"fmt"
	"strings"
)

// Plot puts a plot on the page, with its title as the caption. What is drawn in it later still appears.
func (p *Page) Plot(x *Plot) { p.put(figure{x}) }

// figure is a plot on a page.
type figure struct{ plot *Plot }

func (f figure) check() error {
	if f.plot == nil {
		return errors.New("a nil plot; make one with page.NewPlot")
	}
	return f.plot.check()
}

func (f figure) csv() ([][]string, error) {
	if err := f.check(); err != nil {
		return nil, err
	}
	return f.plot.csv()
}

// text says what the plot shows.
func (f figure) text(t *terminal) error {
	if err := f.check(); err != nil {
		return err
	}
	t.hang("Plot: ", t.strong("Plot:")+" ", f.plot.Alt())
	return nil
}

func (f figure) html(s *hypertext) error {
	if err := f.check(); err != nil {
		return err
	}
	svg, err := f.plot.SVG()
	if err != nil {
		return err
	}
	s.plots++
	s.WriteString("<figure>\n")
	s.Write(svg)
	fmt.Fprintf(s, "<figcaption><b>Figure %d</b> ", s.plots)
	s.isolate(f.plot.title)
	s.WriteString("</figcaption>\n</figure>\n")
	return nil
}

func (f figure) markdown(b *markdown) error {
	if err := f.check(); err != nil {
		return err
	}
	b.plots++
	alt := escapeMarkdown(f.plot.Alt(), false)
	if b.keep == nil {
		b.WriteString(fmt.Sprintf("*Figure %d.* ", b.plots) + alt + "\n")
		return nil
	}
	svg, err := f.plot.SVG()
	if err != nil {
		return err
	}
	to, err := b.keep.store(fmt.Sprintf("plot-%d.svg", b.plots), svg)
	if err != nil {
		return err
	}
	b.WriteString("![" + alt + "](<" + to + ">)\n\n" + fmt.Sprintf("*Figure %d.* ", b.plots) + escapeMarkdown(f.plot.title, false) + "\n")
	return nil
}

// plotDPI is the resolution of plots for LaTeX, in dots per inch: that of fine print.
const plotDPI = 300

func (f figure) latex(d *document) error {
	if err := f.check(); err != nil {
		return err
	}
	d.plots++
	d.WriteString("\\begin{center}\n")
	caption := f.plot.Alt()
	if d.keep != nil {
		var png bytes.Buffer
		if err := f.plot.PNG(&png, plotDPI); err != nil {
			return err
		}
		to, err := d.keep.store(fmt.Sprintf("plot-%d.png", d.plots), png.Bytes())
		if err != nil {
			return err
		}
		d.WriteString("\\includegraphics[width=\\linewidth,height=0.8\\textheight,keepaspectratio]{" + to + "}\\par\n")
		caption = f.plot.title
	}
	d.WriteString(fmt.Sprintf("Figure %d: ", d.plots) + escapeLaTeX(caption) + "\n\\end{center}\n")
	return nil
}

// store keeps the content and refuses a reference that the output could read as something else.
func (k Keep) store(name string, content []byte) (string, error) {
	to, err := k(name, content)
	if err != nil {
		return "", fmt.Errorf("keep %s: %w", name, err)
	}
	if odd := strings.IndexFunc(to, func(r rune) bool { return r < ' ' || strings.ContainsRune(`<>\{}%#$&^~"`, r) }); odd >= 0 || to == "" {
		return "", fmt.Errorf("keep %s: the reference %q has characters that mean something else there; give letters, digits, - . _ and /", name, to)
	}
	return to, nil
}
