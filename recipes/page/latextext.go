package page

import (
	"fmt"
	"strings"
)

// latexSigns are the characters that LaTeX would not show as they are. Brackets and stars are enclosed, for they would
// be arguments after the end of a line; hyphens are kept from becoming dashes.
var latexSigns = map[rune]string{
	'\\': `\textbackslash{}`, '{': `\{`, '}': `\}`, '$': `\$`, '&': `\&`, '#': `\#`, '%': `\%`, '_': `\_`,
	'^': `\textasciicircum{}`, '~': `\textasciitilde{}`, '<': `\textless{}`, '>': `\textgreater{}`, '|': `\textbar{}`,
	'"': `\textquotedbl{}`, '`': `\textasciigrave{}`, '[': `{[}`, ']': `{]}`, '*': `{*}`,
	'\u00a0': `~`, '\u00b5': `\textmu{}`, '\u03a9': `\textohm{}`, '\u00b0': `\textdegree{}`, '\u00b1': `\textpm{}`,
	'\u00d7': `\texttimes{}`, '\u2013': `\textendash{}`, '\u2014': `\textemdash{}`, '\u2026': `\textellipsis{}`,
	'\u2018': "`{}", '\u2019': `'{}`, '\u201c': `\textquotedblleft{}`, '\u201d': `\textquotedblright{}`,
	'\u2264': `$\leq$`, '\u2265': `$\geq$`, '\u2248': `$\approx$`, '\u221a': `$\surd$`,
}

// latexLetters are the letters beyond ASCII and Latin-1 that the T1 encoding has.
const latexLetters = "ĂăĄąĆćČčĎďĐđĘęĚěĞğĹĺĽľŁłŃńŇňŐőŒœŔŕŘřŚśŞşŠšŢţŤťŮůŰűŸŹźŻżŽž"

const breakAfter = 24 // characters without a space, after which a line may be broken

// escapeLaTeX writes text so that LaTeX shows it as it is.
func escapeLaTeX(s string) string {
	var b strings.Builder
	run := 0
	last := rune(0)
	for _, r := range s {
		if run++; r == ' ' {
			run = 0
		} else if run > breakAfter {
			b.WriteString(`\allowbreak{}`)
			run = 1
		}
		if r == last && (r == '-' || r == ',' || r == '\'') {
			b.WriteString("{}") // two would become one sign
		}
		last = r
		switch sign, ok := latexSigns[r]; {
		case ok:
			b.WriteString(sign)
		case r < 0x7f, r >= 0xc0 && r <= 0xff && r != 0xd7 && r != 0xf7, strings.ContainsRune(latexLetters, r):
			b.WriteRune(r)
		default:
			fmt.Fprintf(&b, `\unichar{%04X}`, r)
		}
	}
	return b.String()
}

// latexCode writes a line of code: also its spaces and quotes as they are.
func latexCode(s string) string {
	words := strings.Split(s, " ")
	for i, w := range words {
		w = escapeLaTeX(w)
		words[i] = strings.ReplaceAll(strings.ReplaceAll(w, "'", `\textquotesingle{}`), "-", "-{}")
	}
	var b strings.Builder
	for i, w := range words {
		if i > 0 {
			if words[i-1] == "" || w == "" {
				b.WriteByte('~')
			} else {
				b.WriteByte(' ')
			}
		}
		b.WriteString(w)
	}
	return b.String()
}

// latexSpans writes prose with its styles.
func latexSpans(spans []span) string {
	var b strings.Builder
	for _, s := range merge(spans) {
		if s.text == "\n" {
			b.WriteString("\\newline\n")
			continue
		}
		body := escapeLaTeX(s.text)
		if s.style&code != 0 {
			body = `\texttt{` + latexCode(s.text) + `}`
		}
		if s.style&emphasis != 0 {
			body = `\emph{` + body + `}`
		}
		if s.style&strong != 0 {
			body = `\textbf{` + body + `}`
		}
		b.WriteString(body)
	}
	return strings.TrimSpace(b.String())
}
