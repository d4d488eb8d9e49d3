package page

import (
	"path/filepath"
	"runtime"
	"testing"
)

// Each item knows the line that put it on the page, also where a helper did so on a recipe's behalf.
func TestItemsRememberTheirStatement(t *testing.T) {
	p := New("T")
	_, _, line, _ := runtime.Caller(0)
	p.Say("one")      // line + 1
	p.Warn("two")     // line + 2
	p.Table(nil)      // line + 3
	p.Figures(Figure{ // line + 4
		Name: "four",
	})
	helper(p) // line + 7
	for i, want := range []int{1, 2, 3, 4} {
		file, got := p.items[i].origin.statement()
		if filepath.Base(file) != "origin_test.go" || got != line+want {
			t.Errorf("item %d: %s:%d, want origin_test.go:%d", i, file, got, line+want)
		}
	}
	frames := runtime.CallersFrames(p.items[4].origin)
	inner, _ := frames.Next()
	outer, _ := frames.Next()
	if inner.Function != "ringbook/recipes/page.helper" || outer.Line != line+7 {
		t.Errorf("the helper's item: %s called from line %d, want helper from %d", inner.Function, outer.Line, line+7)
	}
}

func helper(p *Page) { p.Say("from a helper") }
