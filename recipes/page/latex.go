package page

import (
	"fmt"
	"io"
	"strings"
)

// LaTeXOptions says how LaTeX is to be written.
type LaTeXOptions struct {
	Keep Keep // stores each plot, as PNG; nil: a plot is its text alternative
}

// document gathers the LaTeX of a page.
type document struct {
	strings.Builder
	keep  Keep
	plots int
}

// preamble needs nothing that a LaTeX of 2021 or later does not bring, with siunitx version 3. pdfTeX has no letter for
// most of Unicode, so there a rare character is shown by its number; LuaLaTeX and XeLaTeX set it where their type has it.
const preamble = `\documentclass[a4paper,10pt]{article}
\usepackage{iftex}
\ifPDFTeX
  \usepackage[T1]{fontenc}
  \usepackage{textcomp}
  \IfFileExists{lmodern.sty}{\usepackage{lmodern}}{}
  \newcommand*{\unichar}[1]{\texttt{U+#1}}
\else
  \usepackage{fontspec}
  \newcommand*{\unichar}[1]{\symbol{"#1}}
\fi
\usepackage[margin=22mm]{geometry}
\usepackage{array}
\usepackage{booktabs}
\usepackage{longtable}
\usepackage{graphicx}
\usepackage{siunitx}
\sisetup{group-digits=none}
\setlength{\parindent}{0pt}
\setlength{\parskip}{0.6\baselineskip}
\setlength{\LTleft}{0pt}
\setlength{\LTright}{\fill}
\setlength{\LTcapwidth}{\linewidth}
\setlength{\tabcolsep}{4pt}
\emergencystretch=3em
\frenchspacing
`

// LaTeX writes the page as a complete article: tables by booktabs and longtable, numbers and units by siunitx, plots by
// graphicx, the recipe's code as it stands. Text from outside is text, whatever it contains. Nothing is written when
// there is an error.
func (p *Page) LaTeX(w io.Writer, o LaTeXOptions) error {
	bodies, err := p.woven()
	if err != nil {
		return err
	}
	d := &document{keep: o.Keep}
	d.WriteString(preamble + "\\begin{document}\n\n{\\LARGE\\bfseries\\raggedright " + escapeLaTeX(p.title) + "\\par}\n")
	err = p.render("LaTeX", bodies, func(b body) error {
		d.WriteByte('\n')
		return b.latex(d)
	})
	if err != nil {
		return err
	}
	d.WriteString("\n\\end{document}\n")
	if _, err := io.WriteString(w, d.String()); err != nil {
		return fmt.Errorf("page %q as LaTeX: %w", p.title, err)
	}
	return nil
}

func (s sentence) latex(d *document) error {
	d.WriteString(latexSpans(s.spans) + "\n")
	return nil
}

func (w warning) latex(d *document) error {
	d.WriteString("\\begin{quote}\\textbf{Warning:} " + latexSpans(w.spans) + "\\end{quote}\n")
	return nil
}

func (f *failure) latex(d *document) error {
	d.WriteString("\\begin{quote}\\textbf{Error:} " + escapeLaTeX(f.message) + "\\end{quote}\n")
	return nil
}

func (f *foot) latex(d *document) error {
	d.WriteString("\\par\\noindent\\rule{\\linewidth}{0.4pt}\n{\\footnotesize\\raggedright\n")
	for _, l := range f.lines() {
		d.WriteString(escapeLaTeX(l.name) + ": " + escapeLaTeX(l.value) + "\\par\n")
	}
	d.WriteString("}\n")
	return nil
}

func (t *Table) latex(d *document) error {
	g, err := t.grid()
	if err != nil {
		return err
	}
	d.grid(g)
	return nil
}

func (fs figureList) latex(d *document) error {
	g, err := fs.grid()
	if err != nil || len(g.rows) == 0 {
		return err
	}
	g.title = keyFigures
	for j := range g.columns {
		g.columns[j].align = left
		g.columns[j].quantity = j == 1 || j == 2
	}
	d.grid(g)
	return nil
}
