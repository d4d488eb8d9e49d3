package page_test

import (
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"unicode"

	"pgregory.net/rapid"

	"ringbook/recipes/page"
)

// texWords are the commands that a page may use in its body, with the text each stands for.
var texWords = map[string]string{
	"textbackslash": `\`, "textasciicircum": "^", "textasciitilde": "~", "textless": "<", "textgreater": ">", "textbar": "|",
	"textquotedbl": `"`, "textasciigrave": "`", "textquotesingle": "'", "textmu": "µ", "textohm": "Ω", "textdegree": "°", "textpm": "±",
	"texttimes": "×", "textendash": "–", "textemdash": "—", "textellipsis": "…", "textquotedblleft": "“", "textquotedblright": "”",
	"allowbreak": "", "newline": " ", "textbf": "", "emph": "", "texttt": "", "section": "", "subsection": "", "subsubsection": "",
	"par": " ", "noindent": "", "rule": "", "linewidth": "", "footnotesize": "", "scriptsize": "", "tiny": "", "small": "", "ttfamily": "",
	"raggedright": "", "arraybackslash": "", "LARGE": "", "bfseries": "", "caption": "", "toprule": "", "midrule": "", "bottomrule": "",
	"endhead": "", "endlastfoot": "", "num": "", "numrange": " ", "unit": "", "multicolumn": "", "mbox": "", "item": "", "quad": " ", "phantom": "",
	"textheight": "", "includegraphics": "", "leq": "≤", "geq": "≥", "approx": "≈", "surd": "√",
	"mega": "M", "nano": "n", "micro": "µ", "pico": "p", "hertz": "Hz", "henry": "H", "farad": "F", "volt": "V", "percent": "%", "second": "s",
}

// readLaTeX checks a page's body as far as can be without LaTeX: braces and environments in pairs, no command but those
// above, no sign that means something outside its place. It gives the text.
func readLaTeX(t failer, src string) string {
	t.Helper()
	_, body, ok := strings.Cut(src, "\\begin{document}\n")
	if !ok || !strings.HasSuffix(body, "\n\\end{document}\n") {
		t.Errorf("no document in\n%s", src)
		return ""
	}
	body = strings.TrimSuffix(body, "\\end{document}\n")
	var out strings.Builder
	var environments []string
	depth, math := 0, false
	in := func(name string) bool { return len(environments) > 0 && environments[len(environments)-1] == name }
	fail := func(what string, rest string) {
		t.Errorf("%s before %.60q in\n%s", what, rest, body)
	}
	for rest := body; rest != ""; {
		c := rest[0]
		switch c {
		default:
			out.WriteByte(c)
			if len(rest) > 1 && rest[1] == c && strings.IndexByte("-,'", c) >= 0 {
				fail("two signs that become one", rest)
			}
		case '{':
			depth++
		case '}':
			if depth--; depth < 0 {
				fail("a brace too many", rest)
				return ""
			}
		case '$':
			math = !math
		case '~':
			out.WriteByte(' ')
		case '&':
			if !in("longtable") {
				fail("& outside a table", rest)
			}
			out.WriteByte(' ')
		case '#', '%', '^', '_', '<', '>', '|', '"', '`':
			if c != '`' && !(c == '>' && strings.HasPrefix(rest, `>{\raggedright`)) {
				fail("a bare "+string(c), rest)
			}
		case '\\':
			name := rest[1:]
			name = name[:len(name)-len(strings.TrimLeftFunc(name, unicode.IsLetter))]
			rest = rest[1+len(name):]
			switch {
			case name == "":
				if rest[0] != '\\' {
					if !strings.ContainsRune(`{}$&#%_`, rune(rest[0])) {
						fail("an odd command", rest)
					}
					out.WriteByte(rest[0])
				} else {
					out.WriteByte(' ')
					if after := strings.TrimSpace(rest[1:]); strings.HasPrefix(after, "[") || strings.HasPrefix(after, "*") {
						fail("an argument of the line's end", rest)
					}
				}
				rest = rest[1:]
			case name == "begin", name == "end":
				what, after, _ := strings.Cut(rest[1:], "}")
				rest = after
				if name == "begin" {
					environments = append(environments, what)
				} else if !in(what) {
					fail("the wrong end", rest)
					return ""
				} else {
					environments = environments[:len(environments)-1]
				}
				out.WriteByte(' ')
			case name == "unichar":
				hex, after, _ := strings.Cut(rest[1:], "}")
				n, err := strconv.ParseInt(hex, 16, 32)
				if err != nil {
					fail("no number of a character", rest)
				}
				out.WriteRune(rune(n))
				rest = after
			default:
				text, known := texWords[name]
				if !known {
					fail("an unknown command "+name, rest)
				}
				out.WriteString(text)
				rest = strings.TrimPrefix(rest, "{}")
			}
			continue
		}
		rest = rest[1:]
	}
	if depth != 0 || len(environments) != 0 || math {
		t.Errorf("%d braces and the environments %v stay open in\n%s", depth, environments, body)
	}
	return out.String()
}

func TestHostileTextInLaTeX(t *testing.T) {
	for in, want := range hostile {
		src := write(t, pageWith(in), "tex")
		checkClean(t, in, src)
		if text := readLaTeX(t, src); strings.Count(text, want) < 9 {
			t.Errorf("%q is shown as %q %d times, want 9 or more:\n%s", in, want, strings.Count(text, want), text)
		}
	}
}

func TestAnyTextSurvivesLaTeX(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.StringOfN(rapid.RuneFrom([]rune("ab1 .)(|\\`*_[]<>&;:/@!#~$+-=,\"'{}^wé–א")), 1, 60, -1).
			Filter(func(s string) bool { return strings.TrimSpace(s) == s && s != "" }).Draw(t, "s")
		var b strings.Builder
		if err := pageWith(s).LaTeX(&b, page.LaTeXOptions{}); err != nil {
			t.Fatal(err)
		}
		if text := readLaTeX(t, b.String()); strings.Count(text, s) < 9 {
			t.Errorf("%q is lost in\n%s", s, text)
		}
	})
}

// A row or a line of code that begins with a bracket or a star is no argument to the end of the one before.
func TestLaTeXLinesBeginWithText(t *testing.T) {
	p := page.New("T")
	tb := page.NewTable("", page.Label("label", "label"))
	for _, s := range []string{"first", "[2pt] x", "*", "[", ""} {
		tb.Row(s)
	}
	p.Table(tb)
	readLaTeX(t, write(t, p, "tex"))
}

func TestLaTeXNumbersAndUnits(t *testing.T) {
	src := write(t, trialsPage(), "tex")
	readLaTeX(t, src)
	for _, want := range []string{`\begin{tabular}[b]{@{}r@{}}ring\\frequency\\/~\unit{\mega\hertz}\end{tabular}`, `& \num{41.570(50)} & \numrange{41.470}{41.670} &`, `bus /~\unit{\volt}`,
		`\num{36.20(41)}~\unit{\nano\henry} & \num{35.40}~\unit{\nano\henry} to \num{37.00}~\unit{\nano\henry}`, `\num{0.0123(11)} & \numrange{0.0101}{0.0145}`,
		`textendash{}\phantom{0.}`, "10R + 1n5"} {
		if !strings.Contains(src, want) {
			t.Errorf("no %s in\n%s", want, src)
		}
	}
}

// Where LaTeX is installed it reads what it is given; where it is not, only the tests above know.
func TestLaTeXCompiles(t *testing.T) {
	if testing.Short() {
		t.Skip("slow")
	}
	for _, engine := range []string{"pdflatex", "lualatex"} {
		if _, err := exec.LookPath(engine); err != nil {
			t.Logf("no %s: not tried", engine)
			continue
		}
		var all []string
		for in := range hostile {
			all = append(all, in)
		}
		long, _ := ladderPage(t, 38e6, 31e6, 28e6)
		long.Say("%s", strings.Repeat("abcdefghij", 1000))
		for name, p := range map[string]*page.Page{"hostile": pageWith(strings.Join(all, " ")), "trials": trialsPage(), "long": long, "history": historyPage(200)} {
			dir := t.TempDir()
			if err := os.WriteFile(filepath.Join(dir, "page.tex"), []byte(write(t, p, "tex")), 0o644); err != nil {
				t.Fatal(err)
			}
			cmd := exec.CommandContext(t.Context(), engine, "-interaction=nonstopmode", "-halt-on-error", "page.tex")
			cmd.Dir = dir
			if out, err := cmd.CombinedOutput(); err != nil {
				t.Errorf("%s of %s: %v\n%s", engine, name, err, out[max(0, len(out)-2000):])
			}
		}
	}
}
