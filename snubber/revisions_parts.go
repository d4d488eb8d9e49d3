package snubber

import (
	"context"
	"fmt"
	"math"

	"ringbook/snubber/leastsq"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"
)

// settle fits, and takes for two what cannot be one part: chi-square falls by no more than that of one degree of freedom
// when a sound part gets an error of its own on one revision (the likelihood-ratio test, as in settle of an outcome), with
// falseAlarm over all parts and revisions. Where more than a third of the parts go so, none is taken to be shared: the words
// that make them one are then no good.
func (t *together) settle(ctx context.Context, c *Comparison) error {
	if err := t.run(ctx); err != nil {
		return err
	}
	var apart []string
	shared := -1
	for t.fit.Cov != nil {
		s, parts, tries := t.suspect()
		if s == nil {
			break
		}
		if shared < 0 {
			shared = parts
		}
		next := t.without(s.kind, s.part, s.revision)
		if err := next.run(ctx); err != nil {
			return err
		}
		fall := math.Max(0, t.fit.Chi2-next.fit.Chi2)
		if next.fit.Cov == nil || (distuv.ChiSquared{K: 1}).Survival(fall)*float64(tries) > falseAlarm {
			break
		}
		p := &t.parts[s.kind][s.part]
		apart = append(apart, fmt.Sprintf("%s (%s) cannot be the same on %s as on the other revisions: it was taken for another part (chi-square falls by %.1f); log parts that differ under different words",
			partInWords(s.kind, p), p.key.name, c.name(s.revision), fall))
		*t = *next
		if 3*len(apart) > shared {
			*t = *newTogether(c.Fits, false)
			c.Warnings = append(c.Warnings, fmt.Sprintf("of %s that should be the same on several revisions more than a third cannot be: none was taken to be; log parts that differ under different words, or in sessions of different names", count(shared, "part")))
			return t.run(ctx)
		}
	}
	c.Warnings = append(c.Warnings, apart...)
	return nil
}

// suspect is a part on one of the revisions that share it.
type suspect struct {
	kind, part, revision int

	slope, weight float64   // of chi-square by an error of the part on this revision alone: half its slope and curvature
	with          []float64 // the latter's elements with the parameters
}

// suspect is the part of which chi-square falls most where it gets an error of its own on one revision, by the fit
// linearised at its minimum (the score test; Rao, Proc. Cambridge Phil. Soc. 44, 50, 1948, from memory); nil where nothing
// is. It also counts the parts shared, and those it chose among.
func (t *together) suspect() (worst *suspect, shared, tries int) {
	var list []*suspect
	for kind := range t.parts {
		for part := range t.parts[kind] {
			on := t.served(kind, part)
			if len(on) < 2 {
				continue
			}
			shared++
			if len(on) == 2 { // to take it off the one is to take it off the other
				on = on[1:]
			}
			for _, k := range on {
				list = append(list, &suspect{kind: kind, part: part, revision: k, with: make([]float64, t.params)})
			}
		}
	}
	byPlace := map[[3]int]*suspect{}
	for _, s := range list {
		byPlace[[3]int{s.kind, s.part, s.revision}] = s
	}
	var own, b leastsq.Block
	for i := range t.blocks {
		x := &t.blocks[i]
		for kind, part := range x.own() {
			s := byPlace[[3]int{kind, part, x.revision}]
			if s == nil {
				continue
			}
			t.eval(x, t.fit.P, t.fit.D, true, &own, &b)
			for r, d := range b.D[kind] {
				s.slope += d * b.R[r]
				s.weight += d * d
				for j := range s.with {
					s.with[j] += d * b.P[r*t.params+j]
				}
			}
		}
	}
	most := 0.0
	for _, s := range list {
		place := [noParts]int{-1, -1}
		place[s.kind] = s.part
		h := mat.NewVecDense(t.params+1, append(append([]float64{}, s.with...), s.weight))
		left := s.weight - mat.Inner(h, t.fit.Joint(place[capacitors], place[resistors]), h)
		if fall := s.slope * s.slope / left; left > 1e-9*s.weight && (worst == nil || fall > most) {
			worst, most = s, fall
		}
	}
	return worst, shared, len(list)
}

// served lists the revisions in which a part of all served in a trial that was kept.
func (t *together) served(kind, part int) []int {
	var on []int
	for _, x := range t.blocks {
		if x.own()[kind] == part && (len(on) == 0 || on[len(on)-1] != x.revision) {
			on = append(on, x.revision)
		}
	}
	return on
}

// without is the same with a part of revision k taken for another than that of the other revisions.
func (t *together) without(kind, part, k int) *together {
	apart := *t
	apart.of = append([][noParts][]int{}, t.of...)
	own := append([]int{}, t.of[k][kind]...)
	for j, i := range own {
		if i == part {
			own[j] = len(t.parts[kind])
		}
	}
	apart.of[k][kind] = own
	for q := range t.parts {
		apart.parts[q] = append([]physicalPart{}, t.parts[q]...)
	}
	apart.parts[kind] = append(apart.parts[kind], t.parts[kind][part])
	return &apart
}

// shared says which parts were taken to be the same, and of which it is not known.
func (t *together) shared(c *Comparison) {
	type look struct{ value, tol float64 }
	alike := map[look]*physicalPart{} // that served on one revision, the latest
	servedOn := map[look]int{}
	looks := 0
	for kind := range t.parts {
		clear(alike)
		clear(servedOn)
		for i := range t.parts[kind] {
			p := &t.parts[kind][i]
			on := t.served(kind, i)
			if len(on) > 1 {
				s := SharedPart{Known: p.key.name}
				if kind == capacitors {
					s.C = p.key.value
				} else {
					s.R = p.key.value
				}
				for _, k := range on {
					s.Revisions = append(s.Revisions, c.name(k))
				}
				c.SharedParts = append(c.SharedParts, s)
			} else if len(on) == 1 {
				l := look{p.key.value, p.key.tol}
				// One of the same words was told apart by its readings.
				if was := alike[l]; was != nil && servedOn[l] != on[0] && (was.key.name != p.key.name || p.key.name == anonymous) {
					looks++
				}
				alike[l], servedOn[l] = p, on[0]
			}
		}
	}
	if looks > 0 {
		c.Warnings = append(c.Warnings, fmt.Sprintf("parts of one value and tolerance served on several revisions (%d times) and were taken for different ones, as neither a part nor a session says that they are the same; where they are, log them under the same part: the differences are then better known", looks))
	}
}

func partInWords(kind int, p *physicalPart) string {
	if kind == capacitors {
		return "the capacitor of " + farads(p.key.value)
	}
	return fmt.Sprintf("the resistor of %.4g ohm", p.key.value)
}
