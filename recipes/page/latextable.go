package page

import (
	"regexp"
	"strconv"
	"strings"
	"unicode/utf8"
)

// grid writes a table, its caption above and its footnotes below. It may be cut between pages; its head is repeated.
func (d *document) grid(g *grid) {
	d.WriteString("{" + g.latexSize() + "\n\\begin{longtable}{@{}")
	pads := make([]suffix, len(g.columns))
	widest := g.widest()
	for j, c := range g.columns {
		longest := widest[j]
		for _, row := range g.rows {
			if c.align == decimal {
				pads[j].widen(suffixOf(row[j]))
			}
		}
		switch {
		case c.align != left:
			d.WriteByte('r')
		case longest > longWord:
			d.WriteString(`>{\raggedright\arraybackslash}p{0.2\linewidth}`)
		default:
			d.WriteByte('l')
		}
	}
	d.WriteString("@{}}\n")
	if g.title != "" {
		d.WriteString("\\caption{" + escapeLaTeX(g.title) + "}\\\\\n")
	}
	d.WriteString("\\toprule\n")
	for j, c := range g.columns {
		if j > 0 {
			d.WriteString(" & ")
		}
		d.WriteString(c.latexHead(widest[j]))
	}
	d.WriteString("\\\\\n\\midrule\n\\endhead\n\\bottomrule\n\\endlastfoot\n")
	for _, row := range g.rows {
		for j, x := range row {
			if j > 0 {
				d.WriteString(" & ")
			}
			d.WriteString(g.columns[j].latexCell(x, pads[j]))
		}
		d.WriteString("\\\\\n")
	}
	if len(g.rows) == 0 {
		d.WriteString("\\multicolumn{" + strconv.Itoa(len(g.columns)) + "}{@{}l@{}}{no rows}\\\\\n")
	}
	d.WriteString("\\end{longtable}\n\\par}\n")
	for _, n := range g.notes {
		d.WriteString("{\\footnotesize ")
		if n.mark != "" {
			d.WriteString("\\textbf{" + n.mark + "}\\quad ")
		}
		d.WriteString(latexSpans(n.spans) + "\\par}\n")
	}
}

// widest is how many characters the longest cell of each column has.
func (g *grid) widest() []int {
	out := make([]int, len(g.columns))
	for j := range g.columns {
		for _, row := range g.rows {
			out[j] = max(out[j], utf8.RuneCountInString(row[j]))
		}
	}
	return out
}

// latexSize is the type a table is set in, by how many characters its rows have.
func (g *grid) latexSize() string {
	total, share := 0, 1.0
	for j, most := range g.widest() {
		c := g.columns[j]
		if c.align == left && most > longWord { // wrapped
			share -= 0.2
			most = 0
		}
		for _, l := range c.headLines(most) {
			most = max(most, utf8.RuneCountInString(l))
		}
		total += most + 2
	}
	switch wide := float64(total) / max(share, 0.2); {
	case wide > 135:
		return `\tiny`
	case wide > 118:
		return `\scriptsize`
	case wide > 105:
		return `\footnotesize`
	}
	return `\small`
}

// headLines breaks a head that is longer than the cells below it. The slash stands with the unit.
func (c gridColumn) headLines(cells int) []string {
	return wrap(c.head, max(cells, 10))
}

func (c gridColumn) latexHead(cells int) string {
	lines := c.headLines(cells)
	for i, l := range lines {
		if before, ok := strings.CutSuffix(l, "/\u00a0"+c.unit); ok && c.unit != "" {
			lines[i] = escapeLaTeX(before) + "/~" + latexUnit(c.unit)
		} else {
			lines[i] = escapeLaTeX(l)
		}
	}
	if len(lines) == 1 {
		return lines[0]
	}
	align := "r"
	if c.align == left {
		align = "l"
	}
	return `\begin{tabular}[b]{@{}` + align + `@{}}` + strings.Join(lines, `\\`) + `\end{tabular}`
}

// latexNumber is what siunitx reads as \num and the page writes.
var latexNumber = regexp.MustCompile(`^-?\d+(\.\d+)?(\(\d+\))?(e[+-]?\d+)?$`)

// latexCell writes a number, a range of two, or text. A number in a column is followed by what the longest has more, unseen.
func (c gridColumn) latexCell(x string, most suffix) string {
	low, high, isRange := strings.Cut(x, " to ")
	switch {
	case c.quantity:
		return latexQuantity(x)
	case c.align == left:
		return escapeLaTeX(x)
	case isRange && latexNumber.MatchString(low) && latexNumber.MatchString(high):
		return `\numrange{` + low + "}{" + high + "}"
	}
	if c.align == right && !latexNumber.MatchString(x) {
		return escapeLaTeX(x)
	}
	out := escapeLaTeX(x)
	if latexNumber.MatchString(x) {
		out = `\num{` + x + "}"
	}
	if pad := most.missing(suffixOf(x)); pad != "" && c.align == decimal {
		out += `\phantom{` + pad + "}"
	}
	return out
}

// latexQuantity writes a value with its unit, or two; what is neither is text.
func latexQuantity(x string) string {
	low, high, isRange := strings.Cut(x, " to ")
	n, unit, _ := strings.Cut(low, "\u00a0")
	if !latexNumber.MatchString(n) {
		return escapeLaTeX(x)
	}
	if !isRange {
		if unit == "" {
			return `\num{` + n + "}"
		}
		return `\num{` + n + "}~" + latexUnit(unit)
	}
	m, other, _ := strings.Cut(high, "\u00a0")
	if !latexNumber.MatchString(m) || other != unit {
		return escapeLaTeX(x)
	}
	if unit == "" {
		return `\numrange{` + n + "}{" + m + "}"
	}
	return `\num{` + n + "}~" + latexUnit(unit) + " to " + `\num{` + m + "}~" + latexUnit(unit)
}

var (
	latexUnits = map[string]string{"F": "farad", "H": "henry", "\u03a9": "ohm", "V": "volt", "A": "ampere", "Hz": "hertz",
		"s": "second", "W": "watt", "J": "joule", "\u00b0C": "degreeCelsius", "%": "percent"}
	latexPrefixes = map[string]string{"f": "femto", "p": "pico", "n": "nano", "\u00b5": "micro", "m": "milli", "k": "kilo",
		"M": "mega", "G": "giga"}
)

// latexUnit writes a unit's symbol by siunitx.
func latexUnit(symbol string) string {
	if u, ok := latexUnits[symbol]; ok {
		return `\unit{\` + u + "}"
	}
	_, n := utf8.DecodeRuneInString(symbol)
	prefix, unit := latexPrefixes[symbol[:n]], latexUnits[symbol[n:]]
	if prefix == "" || unit == "" {
		return escapeLaTeX(symbol)
	}
	return `\unit{\` + prefix + `\` + unit + "}"
}
