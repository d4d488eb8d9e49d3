package page

import "strings"

// Foot says what a page was made from. It stands at the foot of every output. Nothing in it may depend on the day or
// the machine: the same logbook gives the same page.
type Foot struct {
	Scope   string // in words, such as "winch-drive B, since 2031-03-01"
	Digest  string // of the logbook's rows that were used, in hexadecimal
	Version string // of the program
}

// Foot sets the page's foot. What is left empty is left out.
func (p *Page) Foot(f Foot) { p.foot = &foot{plain(f.Scope), plain(f.Digest), plain(f.Version)} }

type foot Foot

// footLine is one line of the foot: what it is, in words and for CSV, and its value.
type footLine struct{ name, csv, value string }

func (f *foot) lines() []footLine {
	var out []footLine
	for _, l := range []footLine{
		{"Scope", "scope", f.Scope},
		{"Digest of the rows used", "rows_digest", f.Digest},
		{"Made by", "made_by", f.Version},
	} {
		if strings.TrimSpace(l.value) != "" {
			out = append(out, l)
		}
	}
	return out
}

func (f *foot) text(t *terminal) error {
	for _, l := range f.lines() {
		t.hang("", "", l.name+": "+l.value)
	}
	return nil
}

func (f *foot) markdown(b *markdown) error {
	b.WriteString("---\n")
	for _, l := range f.lines() {
		b.WriteString("\n" + l.name + ": " + escapeMarkdown(l.value, false) + "\n")
	}
	return nil
}

func (f *foot) csv() ([][]string, error) {
	var head, row []string
	for _, l := range f.lines() {
		head = append(head, l.csv)
		row = append(row, guardCSV(l.value))
	}
	if head == nil {
		return nil, nil
	}
	return [][]string{head, row}, nil
}
