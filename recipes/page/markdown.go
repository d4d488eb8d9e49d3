package page

import (
	"fmt"
	"io"
	"strings"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"
)

// Keep stores what a page refers to and cannot hold itself, such as a plot beside its Markdown, and gives the
// reference to it: a relative path with slashes. Name is a proposal for the file's name, different for each.
type Keep func(name string, content []byte) (reference string, err error)

// MarkdownOptions says how Markdown is to be written.
type MarkdownOptions struct {
	Keep Keep // stores each plot, as SVG; nil: a plot is its text alternative
}

// markdown gathers the Markdown.
type markdown struct {
	strings.Builder
	keep  Keep
	plots int
}

// Markdown writes the page as CommonMark with GitHub's tables: a recipe's prose as it is written, its code in fenced
// blocks. Nothing is written when there is an error.
func (p *Page) Markdown(w io.Writer, o MarkdownOptions) error {
	bodies, err := p.woven()
	if err != nil {
		return err
	}
	b := &markdown{keep: o.Keep}
	b.WriteString("# " + escapeMarkdown(p.title, true) + "\n")
	err = p.render("Markdown", bodies, func(x body) error {
		b.WriteByte('\n')
		return x.markdown(b)
	})
	if err != nil {
		return err
	}
	if _, err := io.WriteString(w, b.String()); err != nil {
		return fmt.Errorf("page %q as Markdown: %w", p.title, err)
	}
	return nil
}

func (s sentence) markdown(b *markdown) error {
	b.WriteString(markdownSpans(s.spans, true) + "\n")
	return nil
}

func (w warning) markdown(b *markdown) error {
	b.WriteString("> **Warning:** " + markdownSpans(w.spans, false) + "\n")
	return nil
}

func (t *Table) markdown(b *markdown) error {
	g, err := t.grid()
	if err != nil {
		return err
	}
	g.markdown(b)
	return nil
}

func (fs figureList) markdown(b *markdown) error {
	g, err := fs.grid()
	if err != nil || len(g.rows) == 0 {
		return err
	}
	g.markdown(b)
	return nil
}

func (g *grid) markdown(b *markdown) {
	if g.title != "" {
		b.WriteString("**" + escapeMarkdown(g.title, false) + "**\n\n")
	}
	w := table.NewWriter()
	w.SetStyle(table.Style{Markdown: table.MarkdownOptions{PadContent: false}})
	var configs []table.ColumnConfig
	row := func(cells []string) table.Row {
		out := make(table.Row, len(cells))
		for j, s := range cells {
			out[j] = cellMarkdown(s)
		}
		return out
	}
	var heads []string
	for j, c := range g.columns {
		cfg := table.ColumnConfig{Number: j + 1, Align: text.AlignLeft}
		if c.align != left {
			cfg.Align = text.AlignRight
		}
		configs = append(configs, cfg)
		heads = append(heads, c.head)
	}
	w.SetColumnConfigs(configs)
	w.AppendHeader(row(heads))
	for _, r := range g.rows {
		w.AppendRow(row(r))
	}
	b.WriteString(w.RenderMarkdown() + "\n")
	if len(g.rows) == 0 {
		b.WriteString("\nno rows\n")
	}
	for _, n := range g.notes {
		b.WriteByte('\n')
		if n.mark != "" {
			b.WriteString("*" + n.mark + "* ")
		}
		b.WriteString(markdownSpans(n.spans, n.mark == "") + "\n")
	}
}

// cellMarkdown escapes a cell; the pipe is left to go-pretty, which escapes it in every cell.
func cellMarkdown(s string) string {
	return strings.ReplaceAll(escapeMarkdown(s, false), `\|`, "|")
}

// markdownSpans writes prose; atStart says that it begins a block.
func markdownSpans(spans []span, atStart bool) string {
	var b strings.Builder
	for i, s := range merge(spans) {
		if s.style&code != 0 {
			b.WriteString(s.style.enclose(codeMarkdown(s.text)))
			continue
		}
		// A delimiter beside a space is no delimiter (CommonMark 0.31.2, 6.2), so spaces stay outside.
		body := strings.Trim(s.text, " ")
		if body == "" {
			b.WriteString(s.text)
			continue
		}
		before, after, _ := strings.Cut(s.text, body)
		b.WriteString(before + s.style.enclose(escapeMarkdown(body, atStart && i == 0)) + after)
	}
	return strings.TrimSpace(b.String())
}

// enclose puts the style's delimiters around what stands between them.
func (st style) enclose(s string) string {
	if st&emphasis != 0 {
		s = "*" + s + "*"
	}
	if st&strong != 0 {
		s = "**" + s + "**"
	}
	return s
}

// codeMarkdown fences code with more backticks than it has in a row (CommonMark 0.31.2, 6.1).
func codeMarkdown(s string) string {
	longest, run := 0, 0
	for i := range len(s) {
		run++
		if s[i] != '`' {
			run = 0
		}
		longest = max(longest, run)
	}
	fence := strings.Repeat("`", longest+1)
	if s == "" || strings.Trim(s, "` ") != s {
		s = " " + s + " "
	}
	return fence + s + fence
}
