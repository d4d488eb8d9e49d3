// Package page is the sheet that a recipe's results are put on. A recipe is an ordinary Go function that
// is given a *Page and puts tables, key figures, sentences and warnings on it in the order they shall be
// read; the page is then rendered as terminal text, as Markdown, or as CSV of its tables. One place makes
// each table, and every output shows the same one.
//
//	p := page.New("Loop of winch-drive B")
//	p.Say("The line through %d trials gives the loop.", len(trials))
//	p.Figures(page.Figure{Name: "loop inductance", Unit: quantity.Inductance, CSV: "inductance_h", Value: l})
//	t := page.NewTable("Trials",
//		page.Label("revision", "revision"),
//		page.Part("C", quantity.Capacitance, "c"),
//		page.Measured("ring", quantity.Frequency, "ring_hz"))
//	t.Row("B", 470e-12, reading)
//	t.Row("B", nil, nil).Note("no ring was found; trigger on the edge")
//	p.Table(t)
//	err := p.Text(os.Stdout, page.TextOptions{})
//
// Tables for people have one SI prefix a column, named in the head with the unit as the SI Brochure (BIPM,
// 9th edition, 2019, 5.4.1) has it, and value(uncertainty) as the GUM (JCGM 100:2008, 7.2.2). CSV has
// unscaled SI values with the unit in the column's name.
//
// Whatever text comes in (a note, an instrument's answer) stays text in every output: no terminal escape,
// no markup, no spreadsheet formula. Mistakes in a table, such as a row that is too short, are found when the
// page is rendered; the error names the table and the row, and nothing is written.
//
// It is not a general document writer: no headings, no lists, no nesting. Each item remembers the statements
// that made it, so that prose and source can be woven around it.
package page
