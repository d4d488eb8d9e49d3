package page

import (
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// What gofmt would not leave so, and what a file in this folder therefore cannot show.
const untidy = "package x\n" +
	"func before(p *Page) { p.Weave(source) }\r\n" +
	"func (m *M) Recipe(p *Page) (err error) { // behind the brace\n" +
	"\tp.Weave(source)\n" +
	"\t/* in front */ p.Say(`one\n" +
	"two`) /* behind */\n" +
	"\tone(p); two(p)\n" +
	"\t\t\tif err != nil { return err }\r\n" +
	"\ts := \"\x1b\u202e\"\n" +
	"\t// the end\n" +
	"}\n"

func TestUntidySource(t *testing.T) {
	said := func(line int) item { return item{place{1, line}, sentence{[]span{{text: "said"}}}} }
	r := recipe{untidy, "example.test/x.(*M).Recipe", "/x.go", 4}
	bodies, err := r.weave([]item{said(5), said(7), said(7), said(11)})
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, b := range bodies {
		switch b := b.(type) {
		case prose:
			got = append(got, "prose "+b.source)
		case *listing:
			got = append(got, b.caption()+"\n"+strings.Join(b.lines, "\n"))
		case sentence:
			got = append(got, flat(b.spans))
		}
	}
	want := []string{"prose behind the brace",
		"Code: x.go, lines 5 to 6\n/* in front */ p.Say(`one\ntwo`) /* behind */", "said",
		"Code: x.go, line 7\none(p); two(p)", "said", "said",
		"Code: x.go, lines 8 to 9\n        if err != nil { return err }\ns := \"\\x1b\\u202e\"", "said",
		"prose the end"}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if _, err := r.weave([]item{said(10)}); err == nil || !strings.Contains(err.Error(), "line 10 made a result and is no statement") {
		t.Errorf("a result of a comment: %v", err)
	}
}
