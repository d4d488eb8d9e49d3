package main

import (
	"ringbook/snubber"
	"ringbook/snubber/quantity"

	"github.com/spf13/cobra"
)

// setupFlags say what was fitted on what, and at which operating point: all of a trial but its readings.
type setupFlags struct {
	board, revision, network, session string
	part, note                        string
	c, measuredC, measuredU, probe    quantity.Farad
	r, esr                            quantity.Ohm
	cTol, rTol                        quantity.Fraction
	bus                               quantity.Volt
	current                           quantity.Ampere
	hz                                quantity.Hertz
}

func (s *setupFlags) add(cmd *cobra.Command) {
	f := cmd.Flags()
	f.StringVar(&s.board, "board", "", "the board's `NAME`")
	f.StringVar(&s.revision, "revision", "", "the board revision's `NAME`")
	f.StringVar(&s.network, "network", "", "`KIND` of network fitted across the switch: bare, c, rc, rcd")
	completes(cmd, "network", string(snubber.Bare), string(snubber.C), string(snubber.RC), string(snubber.RCD))
	f.Var(&s.c, "c", "its capacitor, such as 470p")
	f.Var(&s.cTol, "c-tol", "the capacitor's tolerance, such as 5%")
	f.Var(&s.r, "r", "its resistor, such as 4R7")
	f.Var(&s.rTol, "r-tol", "the resistor's tolerance, such as 1%")
	f.Var(&s.esr, "esr", "the capacitor's equivalent series resistance")
	f.Var(&s.measuredC, "measured-c", "the capacitor as a meter reads it")
	f.Var(&s.measuredU, "measured-c-u", "standard uncertainty of --measured-c")
	f.Var(&s.probe, "probe-c", "the probe's capacitance across the node while reading")
	f.Var(&s.bus, "bus-v", "bus voltage")
	f.Var(&s.current, "current-a", "load current")
	f.Var(&s.hz, "switching-hz", "switching frequency")
	f.StringVar(&s.session, "session", "", "`NAME` of the sitting at the bench this belongs to")
	f.StringVar(&s.part, "part", "", "`WORDS` for what was fitted")
	f.StringVar(&s.note, "note", "", "`WORDS` to remember")
}

// trial is the trial the flags describe, without readings.
func (s *setupFlags) trial() (snubber.Trial, error) {
	for _, f := range []struct{ name, value string }{{"board", s.board}, {"revision", s.revision}, {"network", s.network}} {
		if f.value == "" {
			return snubber.Trial{}, usagef("--%s is missing: a trial needs its board, its revision and its network (bare, c, rc or rcd)", f.name)
		}
	}
	kind, err := snubber.ParseKind(s.network)
	if err != nil {
		return snubber.Trial{}, usagef("--%w", err)
	}
	t := snubber.Trial{
		Board: s.board, Revision: s.revision, Session: s.session, Part: s.part, Note: s.note,
		Network: snubber.Network{Kind: kind, C: float64(s.c), CTol: float64(s.cTol), R: float64(s.r), RTol: float64(s.rTol),
			ESR: float64(s.esr), MeasuredC: float64(s.measuredC), MeasuredU: float64(s.measuredU)},
		ProbeC: float64(s.probe),
		Point:  snubber.OperatingPoint{BusV: float64(s.bus), CurrentA: float64(s.current), SwitchingHz: float64(s.hz)},
	}
	if err := s.partsOf(kind); err != nil {
		return snubber.Trial{}, err
	}
	if err := t.Network.Check(); err != nil {
		return snubber.Trial{}, &usageError{err}
	}
	return t, nil
}

// partsOf sees that the flags give the parts the network has, and no others.
func (s *setupFlags) partsOf(kind snubber.Kind) error {
	for _, p := range []struct {
		has         bool
		flag, given string
		zero        bool
		name, value string
	}{
		{kind.HasC(), "c", s.c.String(), s.c == 0, "capacitor", "470p"},
		{kind.HasR(), "r", s.r.String(), s.r == 0, "resistor", "4R7"},
	} {
		switch {
		case p.has && p.zero:
			return usagef("--network %s has a %s and --%s does not say which; give --%s %s, say", kind, p.name, p.flag, p.flag, p.value)
		case !p.has && !p.zero:
			return usagef("--%s %s is given and --network %s has no %s; leave it out or name the network that has one", p.flag, p.given, kind, p.name)
		}
	}
	return nil
}
