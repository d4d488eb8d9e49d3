package main

import (
	"fmt"
	"math"
	"strings"

	"ringbook/acquire"
	"ringbook/snubber/quantity"
	"ringbook/store"
)

// seriesView shows a series on stderr, in lines that any terminal, log or pipe can take: no cursor is moved.
type seriesView struct {
	app        *app
	unattended bool
	midline    bool            // a line is begun that more may follow on
	falling    bool            // it is that of the bus voltage
	shown      float64         // V: what it showed last
	rows       int             // of the table
	bare       float64         // W: the supply's power with the node bare; 0: not known
	count      string          // how far the series is, in words
	noticed    map[string]bool // what the station said since the last trial
}

const caution = "Caution: capacitors keep their charge, and a supply that says it is off may not be. Measure before you touch, " +
	"and keep clear while the supply is on. What may be done on a board like this, and by whom, local codes and licensed practice decide."

// lineWidth is the longest line shown: it fits the narrowest terminal there is.
const lineWidth = 78

func (v *seriesView) begin(s *acquire.Series, switches bool) {
	for _, t := range s.Past {
		v.rememberBare(t)
	}
	if v.unattended {
		return
	}
	v.lines("", caution)
	if !switches {
		v.lines("", "No instrument of the rig switches the supply: you are asked to, before and after each swap.")
	}
}

func (v *seriesView) end(r acquire.SeriesResult, err error) {
	v.newline()
	switch {
	case err != nil:
		v.app.progress("Of this run %s logged; the same command goes on from there.", are(len(r.Trials), "trial"))
	case v.app.json:
		v.app.progress("The series ended: %s.", r.Ended)
	default:
		v.app.progress("")
	}
}

// lines writes text whether or not progress is wanted.
func (v *seriesView) lines(indent, text string) {
	v.newline()
	for _, line := range wrap(text, indent, lineWidth) {
		fmt.Fprintln(v.app.stderr, line)
	}
}

func (v *seriesView) newline() {
	if v.midline {
		fmt.Fprintln(v.app.stderr)
		v.midline = false
	}
}

func (v *seriesView) part(format string, args ...any) {
	if !v.app.quiet {
		fmt.Fprintf(v.app.stderr, format, args...)
		v.midline = true
	}
}

func (v *seriesView) remark(text string) {
	if v.newline(); !v.app.quiet {
		v.lines("     ", text)
	}
}

func (v *seriesView) tell(e acquire.Event) {
	switch e := e.(type) {
	case acquire.Output:
		switch {
		case e.On:
			v.newline()
			v.part("     Supply on.")
		case v.midline:
			v.part(" Supply off.")
		default:
			v.part("     Supply off.")
		}
	case acquire.Taking:
		if !v.midline {
			v.part("    ")
		}
		v.part(" Reading %s", describe(e.Network))
	case acquire.Discharging:
		v.bus(e.Volts)
	case acquire.Safe:
		v.part(": safe, below %.3g V.", e.LimitV)
		v.falling = false
		v.newline()
	case acquire.Logged:
		v.logged(e)
	case acquire.Struck:
		v.remark("Trial " + store.ShortID(e.ID) + " is struck: " + e.Because + ".")
	case acquire.Remark:
		v.remark(e.Text)
	}
}

// read shows a dot for each quantity.
func (v *seriesView) read(p acquire.Progress) {
	if v.midline && p.Repeat == p.Repeats {
		v.part(".")
	}
}

// notice shows what the station says at once. Where it is a warning of the trial too, it is not said again.
func (v *seriesView) notice(text string) {
	v.noticed[text] = true
	v.remark(text + ".")
}

// are is so many of a thing, with its verb.
func are(n int, name string) string {
	if n == 1 {
		return "1 " + name + " is"
	}
	return fmt.Sprintf("%d %ss are", n, name)
}

// bus shows the voltage as often as it has halved.
func (v *seriesView) bus(volts float64) {
	if !v.falling {
		v.newline()
		v.part("     Bus")
		v.falling, v.shown = true, math.Inf(1)
	}
	switch {
	case math.IsNaN(volts):
		v.part(" no reading")
	case volts < v.shown/2:
		if math.Abs(volts) < 0.01 {
			volts = 0 // or its exponent is all one sees
		}
		v.part(" %s", quantity.Format(volts, quantity.Voltage, 2))
		v.shown = volts
	}
}

func (v *seriesView) question(q acquire.Question) {
	text := q.Text
	switch {
	case q.Again != "":
		text = "Not understood: " + q.Again + "."
	case q.Why != "":
		text += " (" + q.Why + ")"
	}
	if q.Again == "" {
		v.newline()
		fmt.Fprintln(v.app.stderr)
		if q.Kind == acquire.FitPart {
			text = v.count + text
		}
	}
	v.lines("", text)
	v.lines("  ", q.Choices)
	fmt.Fprint(v.app.stderr, "> ")
}

// answer shows what nobody typed here.
func (v *seriesView) answer(line string) { fmt.Fprintln(v.app.stderr, line) }

// wrap breaks text into lines of at most so many characters, each with the indent before it.
func wrap(text, indent string, width int) []string {
	var lines []string
	line := ""
	for _, w := range strings.Fields(text) {
		if line != "" && len([]rune(indent+line))+1+len([]rune(w)) > width {
			lines, line = append(lines, indent+line), ""
		}
		if line != "" {
			line += " "
		}
		line += w
	}
	return append(lines, indent+line)
}
