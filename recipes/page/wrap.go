package page

import (
	"strings"
	"sync"
	"unicode/utf8"

	"github.com/jedib0t/go-pretty/v6/text"
)

// narrow makes go-pretty count the characters of ambiguous width (Unicode Standard Annex 11: – … Ω) as
// one column everywhere. Left alone it asks the locale, and the same page would differ between machines.
var narrow = sync.OnceFunc(func() { text.OverrideRuneWidthEastAsianWidth(false) })

// width is the number of terminal columns s takes.
func width(s string) int {
	narrow()
	return text.StringWidthWithoutEscSequences(s)
}

// cut shortens s to n columns, the last of them an ellipsis when something was left out.
func cut(s string, n int) string {
	if width(s) <= n {
		return s
	}
	return strings.TrimRight(text.Trim(s, n-1), " ") + "…"
}

// wrap breaks s at spaces into lines of at most n columns. A no-break space does not break; a word longer
// than a line does.
func wrap(s string, n int) []string {
	var lines []string
	line := ""
	for word := range strings.SplitSeq(s, " ") {
		if word == "" {
			continue
		}
		if line != "" {
			if width(line)+1+width(word) <= n {
				line += " " + word
				continue
			}
			lines = append(lines, line)
		}
		for width(word) > n {
			head := text.Trim(word, n)
			if head == "" { // one character wider than the line
				_, size := utf8.DecodeRuneInString(word)
				head = word[:size]
			}
			lines = append(lines, head)
			word = word[len(head):]
		}
		line = word
	}
	if line != "" || len(lines) == 0 {
		lines = append(lines, line)
	}
	return lines
}
