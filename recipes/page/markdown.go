package page

import (
	"fmt"
	"io"
	"strings"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"
)

// Markdown writes the page as CommonMark with GitHub's tables. Nothing is written when there is an error.
func (p *Page) Markdown(w io.Writer) error {
	var b strings.Builder
	b.WriteString("# " + escapeMarkdown(p.title, true) + "\n")
	for _, it := range p.items {
		b.WriteByte('\n')
		if err := it.body.markdown(&b); err != nil {
			return fmt.Errorf("page %q as Markdown: %w", p.title, err)
		}
	}
	if _, err := io.WriteString(w, b.String()); err != nil {
		return fmt.Errorf("page %q as Markdown: %w", p.title, err)
	}
	return nil
}

func (s sentence) markdown(b *strings.Builder) error {
	b.WriteString(markdownSpans(s.spans, true) + "\n")
	return nil
}

func (w warning) markdown(b *strings.Builder) error {
	b.WriteString("> **Warning:** " + markdownSpans(w.spans, false) + "\n")
	return nil
}

func (t *Table) markdown(b *strings.Builder) error {
	g, err := t.grid()
	if err != nil {
		return err
	}
	g.markdown(b)
	return nil
}

func (fs figureList) markdown(b *strings.Builder) error {
	g, err := fs.grid()
	if err != nil || len(g.rows) == 0 {
		return err
	}
	g.markdown(b)
	return nil
}

func (g *grid) markdown(b *strings.Builder) {
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
	for i, s := range spans {
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
