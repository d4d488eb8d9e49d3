package page

import (
	"fmt"
	"path"
	"runtime"
)

// recipe is a function that called Weave: the text of its file, and what the binary calls it.
type recipe struct {
	source   string
	function string // as the run-time library names it, such as ringbook/recipes.Substitution
	file     string // as the compiler saw it: a path of the machine, or of the module with -trimpath
	line     int    // of the call of Weave
}

// place is the statement of a recipe that an item belongs to.
type place struct {
	section int // of Page.recipes, counted from 1; 0: put on the page before any recipe
	line    int // in the recipe's own body; 0: put on the page by nobody below the recipe
}

// Weave makes the page a literate one: the recipe that calls it, as the first statement of its body, is shown
// around its results. source is the text of the file that the recipe stands in, which the file embeds itself:
//
//	//go:embed substitution.go
//	var substitutionSource string
//
//	// Substitution is the page of a capacitor-substitution series.
//	func Substitution(ctx context.Context, p *page.Page, src Source) error {
//		p.Weave(substitutionSource)
//
//		// Every trial in scope. Each known capacitor slows the ring by a known amount.
//		trials, err := src.Trials(ctx)
//		...
//
// The function's doc comment is the page's lead. A comment between its statements is prose, in Markdown; its
// statements are code. What is put on the page stands after the statement of the recipe's own body that led to
// it, also where a function elsewhere made it. The call of Weave itself is not shown.
//
// A recipe that another one calls is a function like any other, and its Weave does nothing. Recipes that run one
// after the other on a page are shown one after the other. A text that is not the file's makes rendering fail.
func (p *Page) Weave(source string) {
	stack := stack(1)
	caller, _ := stack.Next()
	if p.within(stack) != 0 {
		return
	}
	p.recipes = append(p.recipes, recipe{source, caller.Function, caller.File, caller.Line})
}

// here is the place of an item that is being put on the page.
func (p *Page) here() place {
	if len(p.recipes) == 0 {
		return place{}
	}
	return place{len(p.recipes), p.within(stack(3))}
}

// within is the line of the latest recipe's body that the stack goes through; 0 where it does not. Of a recipe
// that calls itself the outermost call counts: its statements are the ones shown.
func (p *Page) within(stack *runtime.Frames) int {
	line := 0
	if len(p.recipes) == 0 {
		return line
	}
	r := p.recipes[len(p.recipes)-1]
	for more := true; more; {
		var f runtime.Frame
		if f, more = stack.Next(); f.Function == r.function && f.File == r.file {
			line = f.Line
		}
	}
	return line
}

// stack is the call stack, innermost first, above the function that calls it and skip more.
func stack(skip int) *runtime.Frames {
	var few [64]uintptr
	n := runtime.Callers(skip+2, few[:])
	pcs := few[:n:n]
	for size := len(few); n == size; {
		size *= 4
		pcs = make([]uintptr, size)
		n = runtime.Callers(skip+2, pcs)
		pcs = pcs[:n]
	}
	return runtime.CallersFrames(pcs)
}

// woven is the page with its recipes around the results.
func (p *Page) woven() ([]body, error) {
	sections := make([][]item, len(p.recipes)+1)
	for _, it := range p.items {
		sections[it.place.section] = append(sections[it.place.section], it)
	}
	var out []body
	for _, it := range sections[0] {
		out = append(out, it.body)
	}
	for i, r := range p.recipes {
		bodies, err := r.weave(sections[i+1])
		if err != nil {
			return nil, fmt.Errorf("page %q: weave %s into it: %w", p.title, path.Base(r.file), err)
		}
		out = append(out, bodies...)
	}
	return p.footed(out), nil
}

// weave puts the items into the recipe's text.
func (r recipe) weave(items []item) ([]body, error) {
	s, err := r.read()
	if err != nil {
		return nil, err
	}
	after := make([][]body, len(s.steps)) // the results of each step
	var loose []body                      // put on the page by nobody below the recipe
	var stopped *failure
	last, stop := -1, -1 // the steps of the last result, and of the failure
	for _, it := range items {
		at := -1
		if it.place.line != 0 {
			if at, err = s.at(it.place.line); err != nil {
				return nil, err
			}
		}
		switch b := it.body.(type) {
		case *failure:
			stopped, stop = b, at
		default:
			if at < 0 {
				loose = append(loose, b)
				continue
			}
			after[at] = append(after[at], b)
			last = max(last, at)
		}
	}
	end := len(s.steps)
	if stopped != nil {
		end = max(last, stop) + 1
	}
	out := s.assemble(after, end)
	if stopped != nil {
		out = append(out, stopped)
		for end < len(s.steps) && s.steps[end].weave {
			end++
		}
		if rest := s.listing(end, len(s.steps)); rest != nil && !s.noise(end, len(s.steps)) {
			rest.unreached = true
			out = append(out, rest)
		}
	}
	return append(out, loose...), nil
}
