package page_test

import (
	"bytes"
	"errors"
	"fmt"
	"regexp"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"ringbook/recipes/page"
)

// markdownLines weaves the page as Markdown and gives its lines that are not empty.
func markdownLines(t *testing.T, p *page.Page) []string {
	t.Helper()
	var b bytes.Buffer
	if err := p.Markdown(&b, page.MarkdownOptions{}); err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(b.String(), "\n")
	return slices.DeleteFunc(lines, func(l string) bool { return l == "" })
}

func wantLines(t *testing.T, p *page.Page, want ...string) {
	t.Helper()
	want = append([]string{"# T"}, want...)
	if diff := cmp.Diff(want, markdownLines(t, p)); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

// A closure, with statements that share what they put on the page.
func TestWeaveAClosure(t *testing.T) {
	p := page.New("T")
	recipe := func() error {
		p.Weave(weaveSource)
		p.Say("one")
		// Between.
		for i := range 3 {
			p.Say("loop %d", i)
		}
		defer func() { p.Say("deferred") }()
		defer p.Say("deferred directly")
		func() { p.Say("in a closure") }()
		each(func(i int) bool {
			p.Say("called back %d", i)
			return true
		})
		for i := range each {
			p.Say("ranged %d", i)
		}
		return nil
	}
	if err := p.Run(recipe); err != nil {
		t.Fatal(err)
	}
	p.Say("after")
	wantLines(t, p, "```go", `p.Say("one")`, "```", "one", "Between.",
		"```go", "for i := range 3 {", `    p.Say("loop %d", i)`, "}", "```", "loop 0", "loop 1", "loop 2",
		"```go", `defer func() { p.Say("deferred") }()`, `defer p.Say("deferred directly")`,
		`func() { p.Say("in a closure") }()`, "```", "in a closure",
		"```go", "each(func(i int) bool {", `    p.Say("called back %d", i)`, "    return true", "})", "```",
		"called back 0", "called back 1",
		"```go", "for i := range each {", `    p.Say("ranged %d", i)`, "}", "return nil", "```", "ranged 0", "ranged 1",
		"deferred directly", "deferred", "after")
}

func each(yield func(int) bool) {
	for i := range 2 {
		if !yield(i) {
			return
		}
	}
}

type rig struct{ name string }

// page is a method.
func (r *rig) page(p *page.Page) {
	p.Weave(weaveSource)
	p.Say("of %s", r.name)
}

// short is a method by value.
func (r rig) short(p *page.Page) { p.Weave(weaveSource); p.Say("on one line") }

// generic has a type parameter.
func generic[V any](p *page.Page, v V) {
	p.Weave(weaveSource)
	p.Say("%v", v)
}

// held is a function in a variable.
var held = func(p *page.Page) {
	p.Weave(weaveSource)
	p.Say("held")
}

// Recipes that run one after the other stand one after the other, also the same one twice.
func TestWeaveSeveral(t *testing.T) {
	p := page.New("T")
	p.Say("before")
	r := &rig{"the bench"}
	r.page(p)
	r.page(p)
	r.short(p)
	generic(p, 7)
	held(p)
	method := "page is a method."
	wantLines(t, p, "before",
		method, "```go", `p.Say("of %s", r.name)`, "```", "of the bench",
		method, "```go", `p.Say("of %s", r.name)`, "```", "of the bench",
		"short is a method by value.", "on one line",
		"generic has a type parameter.", "```go", `p.Say("%v", v)`, "```", "7",
		"held is a function in a variable.", "```go", `p.Say("held")`, "```", "held")
}

// outer calls another recipe, and itself.
func outer(p *page.Page, depth int) {
	p.Weave(weaveSource)
	if depth > 0 {
		outer(p, depth-1)
	}
	(&rig{"outer"}).page(p)
}

// A recipe within a recipe is a helper: the outermost one is shown. However deep the stack, its place is found.
func TestWeaveNested(t *testing.T) {
	p := page.New("T")
	outer(p, 200)
	got := markdownLines(t, p)
	want := []string{"# T", "outer calls another recipe, and itself.", "```go", "if depth > 0 {", "    outer(p, depth-1)", "}", "```"}
	if diff := cmp.Diff(want, got[:len(want)]); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if n := len(got); n != len(want)+200+3+1 || got[n-3] != `(&rig{"outer"}).page(p)` {
		t.Errorf("%d lines, the last %q", n, got[n-4:])
	}
}

// early leaves by an error, after two results.
func early(p *page.Page, fail bool) error {
	p.Weave(weaveSource)
	// First.
	p.Say("one")
	defer p.Say("deferred")
	// Second.
	p.Say("two")
	if fail {
		return errors.New("nothing to fit; take a trial")
	}
	// Third.
	p.Say("three")
	return nil
}

func TestRunShowsAnErrorAtItsPlace(t *testing.T) {
	p := page.New("T")
	err := p.Run(func() error { return early(p, true) })
	if err == nil || err.Error() != "nothing to fit; take a trial" {
		t.Errorf("error %v", err)
	}
	got := markdownLines(t, p)
	for i, l := range got {
		got[i] = lineNumbers.ReplaceAllString(l, "lines N to N")
	}
	want := []string{"# T", "early leaves by an error, after two results.", "First.", "```go", `p.Say("one")`, "```", "one",
		"```go", `defer p.Say("deferred")`, "```", "Second.",
		"```go", `p.Say("two")`, "```", "two", "```go", "if fail {", `    return errors.New("nothing to fit; take a trial")`, "}", "```", "deferred",
		"> **Error:** nothing to fit; take a trial",
		`The rest of the recipe, which gave nothing: weave\_test.go, lines N to N:`, "```go", "// Third.", `p.Say("three")`, "return nil", "```"}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

var lineNumbers = regexp.MustCompile(`lines \d+ to \d+`)

// An error before the first result, and without Weave.
func TestRunWithoutResults(t *testing.T) {
	p := page.New("T")
	if err := p.Run(func() error { return fmt.Errorf("no") }); err == nil || err.Error() != "no" {
		t.Errorf("got %v", err)
	}
	wantLines(t, p, "> **Error:** no")
	p = page.New("T")
	recipe := func() error {
		p.Weave(weaveSource)
		// Nothing is in scope.
		return errors.New("an empty logbook; take a trial")
	}
	_ = p.Run(recipe)
	got := markdownLines(t, p)
	if got[1] != "> **Error:** an empty logbook; take a trial" || len(got) != 7 {
		t.Errorf("got %q", got)
	}
}

func TestRunTurnsAPanicIntoAnError(t *testing.T) {
	var none []int
	var nowhere *rig
	for name, c := range map[string]struct {
		do   func()
		want string
	}{
		"index":   {func() { _ = none[3] }, "index out of range [3] with length 0"},
		"nil":     {func() { _ = nowhere.name }, "invalid memory address or nil pointer dereference"},
		"string":  {func() { panic("said so") }, "said so"},
		"error":   {func() { panic(errors.New("an error")) }, "an error"},
		"pointer": {func() { panic(&none) }, "a value of type *[]int"},
		"number":  {func() { panic(7) }, "7"},
	} {
		t.Run(name, func(t *testing.T) {
			p := page.New("T")
			err := p.Run(func() error {
				p.Weave(weaveSource)
				p.Say("one")
				c.do() // here
				// Not reached.
				p.Say("two")
				return nil
			})
			if err == nil || !strings.Contains(err.Error(), "of weave_test.go: "+c.want) || !strings.Contains(err.Error(), "panicked in page_test.TestRun") {
				t.Fatalf("got %v", err)
			}
			got := strings.Join(markdownLines(t, p), "\n")
			at := strings.Index(got, "> **Error:** the recipe panicked")
			if code, rest := strings.Index(got, "c.do() // here"), strings.Index(got, "// Not reached."); at < code || at > rest || code < 0 {
				t.Errorf("code at %d, error at %d, rest at %d:\n%s", code, at, rest, got)
			}
			if strings.Contains(got, "\nNot reached.") || strings.Contains(got, "0x") {
				t.Errorf("shown as if it had run, or an address:\n%s", got)
			}
		})
	}
}

// What the text given to Weave may be instead of the recipe's file.
func TestSourceOutOfStep(t *testing.T) {
	lines := strings.SplitAfter(weaveSource, "\n")
	for name, source := range map[string]string{
		"empty":         "",
		"no Go":         "not a program",
		"another file":  recipeSource,
		"older":         strings.Join(lines[4:], ""),
		"newer":         strings.Replace(weaveSource, "import (", "\n\nimport (", 1),
		"another name":  strings.ReplaceAll(weaveSource, "TestSourceOutOfStep", "TestRenamed"),
		"call replaced": strings.ReplaceAll(weaveSource, "p.Weave(source)", "p.Other(source)"),
		"only the head": strings.Join(lines[:20], ""),
	} {
		t.Run(name, func(t *testing.T) {
			p := page.New("T")
			func() {
				p.Weave(source)
				p.Say("one")
			}()
			for output, err := range map[string]error{
				"Markdown": p.Markdown(&bytes.Buffer{}, page.MarkdownOptions{}), "HTML": p.HTML(&bytes.Buffer{}),
				"LaTeX": p.LaTeX(&bytes.Buffer{}, page.LaTeXOptions{}), "text": p.Text(&bytes.Buffer{}, page.TextOptions{Prose: true}),
			} {
				if err == nil || !strings.Contains(err.Error(), `page "T": weave weave_test.go into it: `) || !strings.Contains(err.Error(), "is not the file that the program was built from") {
					t.Errorf("%s: %v", output, err)
				}
			}
			if err := errors.Join(p.Text(&bytes.Buffer{}, page.TextOptions{}), p.CSV(&bytes.Buffer{})); err != nil {
				t.Errorf("the results alone need no source: %v", err)
			}
		})
	}
}
