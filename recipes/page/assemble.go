package page

import "strings"

// assemble lays out the steps up to end: prose, code, and after each step its results. Statements that follow each
// other without prose or results between them are one listing.
func (s *script) assemble(after [][]body, end int) []body {
	var out []body
	if s.lead != "" {
		out = append(out, prose{s.lead})
	}
	var latest *listing // to which statements may be added that do not deserve a listing of their own
	begin := 0          // of the statements that wait
	flush := func(i int) {
		l := s.listing(begin, i)
		switch {
		case l == nil:
		case latest != nil && s.noise(begin, i):
			*latest = *s.join(latest, l)
		default:
			latest = l
			out = append(out, l)
		}
		begin = i
	}
	for i, st := range s.steps[:end] {
		switch {
		case st.weave:
			flush(i)
			begin = i + 1
		case !st.code:
			flush(i)
			begin = i + 1
			latest = nil
			out = append(out, prose{st.prose})
		}
		if len(after[i]) > 0 {
			flush(i + 1)
			out = append(out, after[i]...)
		}
	}
	flush(end)
	return out
}

// noise says whether steps i to j do nothing that a reader would miss.
func (s *script) noise(i, j int) bool {
	for _, st := range s.steps[i:j] {
		if !st.noise {
			return false
		}
	}
	return true
}

// listing is the code of steps i to j; nil where there is none.
func (s *script) listing(i, j int) *listing {
	if i >= j {
		return nil
	}
	return s.lined(s.steps[i].first, s.steps[j-1].last)
}

// join is one listing of two, with the lines between them.
func (s *script) join(a, b *listing) *listing { return s.lined(a.first, b.last) }

// lined is a listing of whole lines, as in the file but less the indentation that all share. Tabs become four spaces.
func (s *script) lined(first, last int) *listing {
	indent := -1
	for n := first; n <= last; n++ {
		l := s.lines[n-1]
		if strings.TrimSpace(l) == "" || s.whole[n] {
			continue
		}
		tabs := len(l) - len(strings.TrimLeft(l, "\t"))
		if indent < 0 || tabs < indent {
			indent = tabs
		}
	}
	out := &listing{file: s.name, first: first, last: last}
	for n := first; n <= last; n++ {
		l := strings.TrimRight(s.lines[n-1], "\r")
		if !s.whole[n] {
			l = l[min(max(indent, 0), len(l)-len(strings.TrimLeft(l, "\t"))):]
		}
		out.lines = append(out.lines, plain(strings.ReplaceAll(l, "\t", "    ")))
	}
	return out
}
