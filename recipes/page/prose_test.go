package page_test

import (
	_ "embed"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"ringbook/recipes/page"
)

//go:embed prose_test.go
var proseSource string

// proseRecipe has every kind of prose, and comments that are none.
func proseRecipe(p *page.Page) {
	p.Weave(proseSource)
	// # One
	//
	// Two
	// ===
	//
	// ###### Six
	//
	// Say ``a`b`` and **strong *both***,\
	// [a link](https://notes.invalid/x) or <https://notes.invalid/y>; 2 * 3 &lt; 7.
	//
	// - loose
	//
	// - items
	//
	//   of two paragraphs
	//
	// ```
	// # no heading
	// ```
	//
	// ***
	p.Say("said") // trailing, so code
	//nolint:all
	//go:directive

	/* in front */
	p.Say("also")
	fence := "```"
	_ = fence
	/* One line. */
	/*
	  Indented alike,
	  and a [trick](javascript:alert(1)).
	*/
	func() {
		// inside a statement
	}()
	// Control: ` + "\x1b" + ` is a letter.
}

func TestProse(t *testing.T) {
	p := page.New("T")
	proseRecipe(p)
	got := strings.Split(write(t, p, "md"), "\n")
	want := []string{"# T", "", "proseRecipe has every kind of prose, and comments that are none.", "",
		"## One", "", "Two", "---", "", "###### Six", "",
		"Say ``a`b`` and **strong *both***,\\", "[a link](https://notes.invalid/x) or <https://notes.invalid/y>; 2 * 3 &lt; 7.", "",
		"- loose", "", "- items", "", "  of two paragraphs", "", "```", "# no heading", "```", "", "***", "",
		"```go", `p.Say("said") // trailing, so code`, "```", "", "said", "",
		"in front", "", "```go", `p.Say("also")`, "```", "", "also", "",
		"````go", "fence := \"```\"", "_ = fence", "````", "", "One line.", "Indented alike,", "and a [trick](javascript:alert(1)).", "",
		"```go", "func() {", "    // inside a statement", "}()", "```", "",
		"Control: ` + \"\\x1b\" + ` is a letter.", ""}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	text := write(t, p, "txt")
	for _, want := range []string{"\nOne\n\nTwo\n\nSix\n\nSay a`b and strong both,\na link (https://notes.invalid/x) or https://notes.invalid/y; 2 * 3 < 7.\n\n" +
		"- loose\n\n- items\n\n  of two paragraphs\n\n    # no heading\n\n────────────────────\n\nsaid\n\nin front\n\nalso\n\nOne line. Indented alike, and a trick (javascript:alert(1)).\n"} {
		if !strings.Contains(text, want) {
			t.Errorf("text: got\n%s\nwant in it\n%s", text, want)
		}
	}
	html := write(t, p, "html")
	for _, want := range []string{"<h2>One</h2>\n<h2>Two</h2>\n<h6>Six</h6>", `<a href="https://notes.invalid/x">a link</a>`, `<a href="">trick</a>`, "<hr>"} {
		if !strings.Contains(html, want) {
			t.Errorf("no %q in\n%s", want, html)
		}
	}
	if text := readLaTeX(t, write(t, p, "tex")); !strings.Contains(text, "a link (https://notes.invalid/x) or https://notes.invalid/y; 2 * 3 < 7.") {
		t.Errorf("LaTeX: got\n%s", text)
	}
}
