// Package page is the sheet that a recipe's results are put on. A recipe is an ordinary Go function that
// is given a *Page and puts tables, key figures, plots, sentences and warnings on it in the order they shall be
// read; the page is then rendered as HTML, as Markdown, as LaTeX, as terminal text, or as CSV of its tables. One
// place makes each table, and every output shows the same one.
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
// A recipe becomes a literate page when its file embeds itself and its first statement hands that text to Weave: the
// comments between its statements are then the prose, in Markdown, the statements the code, and each result stands
// after the statement that made it. The idea of a program that reads as an essay is Donald E. Knuth's ("Literate
// Programming", The Computer Journal 27, 97, 1984); here the file is what the compiler sees, in the compiler's order.
// The example Recipe is a whole one. Page.Run runs a recipe so that an error or a panic stands on the page, at its
// place.
//
// Tables for people have one SI prefix a column, named in the head with the unit as the SI Brochure (BIPM,
// 9th edition, 2019, 5.4.1) has it, and value(uncertainty) as the GUM (JCGM 100:2008, 7.2.2). CSV has
// unscaled SI values with the unit in the column's name.
//
// Whatever text comes in (a note, an instrument's answer) stays text in every output: no terminal escape,
// no markup, no spreadsheet formula. Mistakes in a table, such as a row that is too short, and a text that is not the
// recipe's file are found when the page is rendered; the error names the table and the row, and nothing is written.
//
// It is not a general document writer: results do not nest, and what prose can have besides paragraphs (headings, lists,
// code) only comments have. It reads no source but what it is given, and never runs a recipe by itself.
package page
