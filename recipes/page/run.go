package page

import (
	"fmt"
	"path"
	"runtime"
	"strings"
)

// Run runs a recipe on the page and gives its error back. The error also stands on the page, after the last statement
// that put something there, and the rest of the recipe is not shown as if it had run. A panic is an error too, which
// stands after the statement it arose in and says the line.
func (p *Page) Run(recipe func() error) (err error) {
	finished := false
	defer func() {
		if finished {
			return
		}
		r := recover()
		if r == nil { // runtime.Goexit, or a panic of nil
			return
		}
		at := place{len(p.recipes), p.within(stack(1))}
		err = fmt.Errorf("the recipe panicked%s: %s", where(stack(1)), cause(r))
		p.items = append(p.items, item{at, &failure{plain(err.Error())}})
	}()
	err = recipe()
	finished = true
	if err != nil {
		p.items = append(p.items, item{place{section: len(p.recipes)}, &failure{plain(err.Error())}})
	}
	return err
}

// cause is what a panic was given, if it is something to read: no address, which differs from run to run.
func cause(r any) string {
	switch r := r.(type) {
	case error:
		return strings.TrimPrefix(r.Error(), "runtime error: ")
	case fmt.Stringer:
		return r.String()
	case string:
		return r
	case bool, int, int64, uint64, float64:
		return fmt.Sprint(r)
	}
	return fmt.Sprintf("a value of type %T", r)
}

// where is the function and line that panicked: the first below the run-time library's own.
func where(stack *runtime.Frames) string {
	panicking := false
	for more := true; more; {
		var f runtime.Frame
		f, more = stack.Next()
		own := strings.HasPrefix(f.Function, "runtime.")
		if panicking && !own {
			return fmt.Sprintf(" in %s, line %d of %s", shortName(f.Function), f.Line, path.Base(f.File))
		}
		panicking = panicking || own
	}
	return ""
}

// failure is the end of a recipe that did not reach its own.
type failure struct{ message string }

func (f *failure) csv() ([][]string, error) { return nil, nil }
