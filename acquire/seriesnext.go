package acquire

import (
	"fmt"
	"strconv"

	"ringbook/snubber"
)

// proposal is what to fit next, and why.
type proposal struct {
	network snubber.Network
	part    Part // zero for the bare node
	why     string
}

// key tells parts apart: by their names, or by their values where they have none.
func (p Part) key() string {
	if p.Name != "" {
		return p.Name
	}
	return strconv.FormatFloat(p.Value, 'g', 9, 64)
}

// next is what to fit next; nil, with the reason, when the series is at its end.
func (s *Series) next() (*proposal, string) {
	if !s.skipped["bare"] && !s.was(func(t snubber.Trial) bool { return t.Network.Kind == snubber.Bare }) {
		return &proposal{network: snubber.Network{Kind: snubber.Bare}, why: "every capacitor is compared with the node alone"}, ""
	}
	left := s.left()
	if len(left) == 0 {
		if s.Drawer != nil {
			return nil, "every capacitor of the drawer was read or skipped"
		}
		return nil, "every capacitor that could tell anything was read or skipped"
	}
	if s.fit == nil { // any will do; one in the middle is least likely to be far from the node's own capacitance
		p := left[len(left)/2]
		return &proposal{p.Network(), p, "with one known capacitor the loop's inductance shows"}, ""
	}
	var on []snubber.Candidate
	for _, p := range left {
		on = append(on, p.Candidate(s.fit.UsualTolerance()))
	}
	best := s.fit.Next(on)
	s.fit.Suggestion = best // of these parts, where the fit alone speaks of the usual ones
	p := left[0]
	for _, x := range left {
		if best != nil && alike(x.Best(), best.C) {
			p = x
			break
		}
	}
	switch {
	case best != nil && !best.Enough:
		return &proposal{p.Network(), p, fmt.Sprintf("it would shrink the uncertainty of Z0 by %.0f %%", 100*best.Gain)}, ""
	case s.All:
		return &proposal{p.Network(), p, "to have all"}, ""
	case !s.contradictable():
		return &proposal{p.Network(), p, "a second capacitor shows whether the first is what it says"}, ""
	}
	s.result.Enough = true
	if best == nil {
		return nil, "no capacitor at hand would tell anything new"
	}
	return nil, best.Because
}

// contradictable says whether two capacitors were fitted: what one alone says, right or wrong, nothing contradicts.
func (s *Series) contradictable() bool { return len(s.capacitors()) > 1 }

// capacitors are the trials that stand with a capacitor, the last of each.
func (s *Series) capacitors() map[string]snubber.Trial {
	all := map[string]snubber.Trial{}
	for _, t := range s.trials {
		if t.Network.C > 0 {
			all[Part{Name: t.Part, Value: t.Network.C}.key()] = t
		}
	}
	return all
}

// onlyOther names the one capacitor besides that of t, where there is but one: of two that contradict each other, either may
// be wrong.
func (s *Series) onlyOther(t snubber.Trial) string {
	all := s.capacitors()
	delete(all, Part{Name: t.Part, Value: t.Network.C}.key())
	if len(all) != 1 || t.Network.C == 0 {
		return ""
	}
	for _, other := range all {
		return describePart(other.Network, other.Part)
	}
	return ""
}

// left is the capacitors that were neither read in the session nor skipped.
func (s *Series) left() []Part {
	all := s.Drawer
	if all == nil {
		all = s.Usual(s.fit)
	}
	var left []Part
	for _, p := range all {
		if !s.skipped[p.key()] && !s.was(p.in) {
			left = append(left, p)
		}
	}
	return left
}

// in says whether p was fitted in a trial.
func (p Part) in(t snubber.Trial) bool {
	same := p.Name == "" || t.Part == "" || t.Part == p.Name
	return same && t.Network.Kind == snubber.C && alike(t.Network.C, p.Value)
}

// was says whether there is such a trial in the session.
func (s *Series) was(such func(snubber.Trial) bool) bool { return s.count(such) > 0 }

func (s *Series) count(such func(snubber.Trial) bool) (n int) {
	for _, t := range s.trials {
		if t.Session == s.Trial.Session && such(t) {
			n++
		}
	}
	return n
}
