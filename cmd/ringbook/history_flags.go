package main

import (
	"errors"
	"strings"

	"ringbook/snubber"
	"ringbook/snubber/quantity"
	"ringbook/store"

	"github.com/spf13/cobra"
)

// searchFlags say which trials to look for, and in what order.
type searchFlags struct {
	scope            scopeFlags
	network, struck  string
	by, next         string
	reverse          bool
	limit            int
	c, r, ring, peak between
}

func (s *searchFlags) add(cmd *cobra.Command) {
	s.scope.add(cmd)
	s.c.read, s.r.read = farads, ohms
	s.ring.read, s.peak.read = hertz, volts
	f := cmd.Flags()
	f.StringVar(&s.network, "network", "", "`KIND` of network fitted: bare, c, rc, rcd")
	completes(cmd, "network", string(snubber.Bare), string(snubber.C), string(snubber.RC), string(snubber.RCD))
	f.Var(&s.c, "c", "capacitor fitted, `LOW..HIGH`: 100p..1n, 1n.., ..470p, 470p")
	f.Var(&s.r, "r", "resistor fitted, `LOW..HIGH`: 4R7..22R")
	f.Var(&s.ring, "ring-hz", "ring frequency read, `LOW..HIGH`: 40MHz..60MHz")
	f.Var(&s.peak, "peak-v", "peak read, `LOW..HIGH`: 90V..")
	f.StringVar(&s.struck, "struck", "any", "trials marked as wrong: `any`, only them, or none of them")
	completes(cmd, "struck", "any", "only", "none")
	f.StringVar(&s.by, "by", "at", "sort by `WHAT`: "+strings.Join(sorts(), ", "))
	completes(cmd, "by", sorts()...)
	f.BoolVar(&s.reverse, "reverse", false, "the newest, or the greatest, first")
	f.IntVar(&s.limit, "limit", 50, "`NUMBER` of trials at most; 0: all")
	f.StringVar(&s.next, "next", "", "the page after the one that named this `TRIAL`")
}

// sorts are what a history can be sorted by, as flags are written.
func sorts() []string {
	names := store.Sorts()
	for i, s := range names {
		names[i] = strings.ReplaceAll(s, "_", "-")
	}
	return names
}

// query is what the flags and the words ask for.
func (s *searchFlags) query(words []string) (q store.Query, err error) {
	if q.Scope, err = s.scope.read(); err != nil {
		return q, err
	}
	q.Words, q.After = strings.Join(words, " "), s.next
	if s.network != "" {
		if q.Network, err = snubber.ParseKind(s.network); err != nil {
			return q, usagef("--%w", err)
		}
	}
	switch s.struck {
	case "any":
		q.IncludeStruck = true
	case "only":
		q.OnlyStruck = true
	case "none":
	default:
		return q, usagef("--struck %q: it must be any, only or none", s.struck)
	}
	if q.Sort, err = store.ParseSort(strings.ReplaceAll(s.by, "-", "_")); err != nil {
		return q, usagef("--by %q: it must be one of %s", s.by, strings.Join(sorts(), ", "))
	}
	if s.limit < 0 {
		return q, usagef("--limit %d: it must be 0 (all) or more", s.limit)
	}
	if s.next != "" && s.limit == 0 {
		return q, usagef("--next %q and --limit 0: a page after another has a limit", s.next)
	}
	q.Limit, q.Descending = s.limit, s.reverse
	q.C, q.R, q.RingHz, q.PeakV = s.c.Range, s.r.Range, s.ring.Range, s.peak.Range
	return q, nil
}

// order says in words what order q gives trials in.
func order(q store.Query, newestLast bool) string {
	name := map[store.Sort]string{store.ByC: "by C", store.ByR: "by R", store.ByRingHz: "by ring frequency", store.ByPeakV: "by peak"}[q.Sort]
	switch {
	case q.Sort == store.ByTime && q.Descending && !newestLast:
		return "in the order they were read, the newest first"
	case q.Sort == store.ByTime:
		return "in the order they were read"
	case q.Descending:
		return name + ", the greatest first"
	}
	return name + ", the least first"
}

// between is a range as a flag: LOW..HIGH, LOW.., ..HIGH, or a value.
type between struct {
	store.Range
	text string
	read func(string) (float64, error)
}

func (b *between) String() string { return b.text }

// Type is empty: the help text has the form.
func (b *between) Type() string { return "" }

func (b *between) Set(text string) error {
	low, high, isRange := strings.Cut(text, "..")
	if !isRange {
		high = low
	}
	var r store.Range
	for _, end := range []struct {
		text string
		into *float64
	}{{low, &r.Min}, {high, &r.Max}} {
		if strings.TrimSpace(end.text) == "" {
			continue
		}
		v, err := b.read(end.text)
		if err != nil {
			return err
		}
		*end.into = v
	}
	switch {
	case r == (store.Range{}):
		return errors.New("write LOW..HIGH, LOW.. or ..HIGH, with a bound above zero")
	case r.Max != 0 && r.Min > r.Max:
		return errors.New("the low end is above the high one; write the low one first")
	case !isRange: // a value that was typed differently, 0.47n for 470p, differs in its last bit
		const ulps = 1e-12
		r.Min, r.Max = r.Min*(1-ulps), r.Max*(1+ulps)
	}
	b.Range, b.text = r, text
	return nil
}

func farads(s string) (float64, error) {
	var v quantity.Farad
	err := v.Set(s)
	return float64(v), err
}

func ohms(s string) (float64, error) {
	var v quantity.Ohm
	err := v.Set(s)
	return float64(v), err
}

func hertz(s string) (float64, error) {
	var v quantity.Hertz
	err := v.Set(s)
	return float64(v), err
}

func volts(s string) (float64, error) {
	var v quantity.Volt
	err := v.Set(s)
	return float64(v), err
}
