package store

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"ringbook/snubber"
)

// Bounds of what a person may write, in bytes.
const (
	maxName = 200       // a board, revision, session or instrument
	maxText = 1_000_000 // part, note and reason together
)

// badField is what is wrong with one field of a trial, under its CSV column's name.
type badField struct {
	column string
	err    error
}

func (b *badField) Error() string { return b.column + ": " + b.err.Error() }
func (b *badField) Unwrap() error { return b.err }

func bad(column, format string, args ...any) error {
	return &badField{column, fmt.Errorf(format, args...)}
}

// Check reports the first thing in t that no logbook can hold: a name that is missing, too long or has control characters,
// a network that snubber.Network.Check refuses or that states a tolerance of a part it does not have, a value that is not
// finite, an uncertainty below zero, a quantity read twice.
func Check(t snubber.Trial) error {
	for _, f := range []struct{ column, text string }{{"board", t.Board}, {"revision", t.Revision}} {
		if f.text == "" {
			return bad(f.column, "it is empty; name the %s", f.column)
		}
		if err := checkName(f.column, f.text); err != nil {
			return err
		}
	}
	if err := checkName("session", t.Session); err != nil {
		return err
	}
	texts := []struct{ column, text string }{{"part", t.Part}, {"note", t.Note}, {"struck", t.Struck}}
	total := 0
	for _, f := range texts {
		if err := checkText(f.column, f.text); err != nil {
			return err
		}
		if total += len(f.text); total > maxText {
			return bad(f.column, "part, note and reason have more than %d bytes together; shorten them or keep the rest in a file of its own", maxText)
		}
	}
	if t.Struck != "" && strings.TrimSpace(t.Struck) == "" {
		return bad("struck", "the reason is blank; say what was wrong with the trial")
	}
	if y := t.At.UTC().Year(); !t.At.IsZero() && (y < 1900 || y > 9999) {
		return bad("at", "the year %d; it must lie from 1900 to 9999", y)
	}
	if err := checkNetwork(t.Network); err != nil {
		return err
	}
	if err := checkPoint(t); err != nil {
		return err
	}
	for i, r := range t.Readings {
		if err := checkReading(r); err != nil {
			return err
		}
		if slices.ContainsFunc(t.Readings[:i], func(o snubber.Reading) bool { return o.Quantity == r.Quantity }) {
			return bad(string(r.Quantity), "it is read twice; give one reading with the single values as its repeats")
		}
	}
	return nil
}

func checkNew(t snubber.Trial) error {
	if t.ID != "" {
		return fmt.Errorf("it has the id %s already, so it is in a logbook; leave the id empty to log it as a new trial", quote(t.ID))
	}
	return Check(t)
}

func checkNetwork(n snubber.Network) error {
	if err := n.Check(); err != nil {
		return &badField{"network", err}
	}
	switch {
	case !n.Kind.HasC() && n.CTol != 0:
		return bad("c_tol", "%g on network %s, which has no capacitor; leave it empty", n.CTol, n.Kind)
	case !n.Kind.HasC() && n.ESR != 0:
		return bad("esr", "%g ohm on network %s, which has no capacitor; leave it empty", n.ESR, n.Kind)
	case !n.Kind.HasC() && n.MeasuredC != 0:
		return bad("measured_c", "%g F on network %s, which has no capacitor; leave it empty", n.MeasuredC, n.Kind)
	case !n.Kind.HasR() && n.RTol != 0:
		return bad("r_tol", "%g on network %s, which has no resistor; leave it empty", n.RTol, n.Kind)
	case !(n.MeasuredC >= 0) || math.IsInf(n.MeasuredC, 0):
		return bad("measured_c", "%g F; it must be a positive, finite capacitance", n.MeasuredC)
	case !(n.MeasuredU >= 0) || math.IsInf(n.MeasuredU, 0):
		return bad("measured_c_u", "%g F; an uncertainty is zero or a positive, finite number", n.MeasuredU)
	case n.MeasuredC == 0 && n.MeasuredU != 0:
		return bad("measured_c_u", "%g F without measured_c; give both or neither", n.MeasuredU)
	}
	return nil
}

func checkPoint(t snubber.Trial) error {
	switch {
	case !(t.ProbeC >= 0) || math.IsInf(t.ProbeC, 0):
		return bad("probe_c", "%g F; it must be zero or a positive, finite capacitance", t.ProbeC)
	case !finite(t.Point.BusV):
		return bad("bus_v", "%g V; it must be a finite number", t.Point.BusV)
	case !finite(t.Point.CurrentA):
		return bad("current_a", "%g A; it must be a finite number", t.Point.CurrentA)
	case !(t.Point.SwitchingHz >= 0) || math.IsInf(t.Point.SwitchingHz, 0):
		return bad("switching_hz", "%g Hz; it must be zero or a positive, finite frequency", t.Point.SwitchingHz)
	}
	return nil
}

func checkReading(r snubber.Reading) error {
	column := string(r.Quantity)
	if !slices.Contains(snubber.Quantities(), r.Quantity) {
		return bad("quantity", "%s is not one this logbook keeps; it must be one of %v", quote(column), snubber.Quantities())
	}
	switch {
	case !finite(r.Value):
		return bad(column, "%g; it must be a finite number", r.Value)
	case r.Value <= 0 && (r.Quantity == snubber.RingHz || r.Quantity == snubber.DecayS || r.Quantity == snubber.SwitchingHz):
		return bad(column, "%g; it must be above zero, or left empty where it was not read", r.Value)
	case !(r.U >= 0) || math.IsInf(r.U, 0):
		return bad(column+"_u", "%g; an uncertainty is zero or a positive, finite number", r.U)
	}
	for i, v := range r.Repeats {
		if !finite(v) {
			return bad(column, "repeat %d is %g; it must be a finite number", i+1, v)
		}
	}
	return checkName("instrument", r.Instrument)
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }

func checkName(column, s string) error {
	switch i := strings.IndexFunc(s, unicode.IsControl); {
	case len(s) > maxName:
		return bad(column, "%s has %d bytes; a name has at most %d", quote(s), len(s), maxName)
	case !utf8.ValidString(s):
		return bad(column, "%s is not UTF-8 text", quote(s))
	case i >= 0:
		return bad(column, "%s has a control character (%U); a name is one line of plain text", quote(s), []rune(s[i:])[0])
	case strings.TrimSpace(s) != s:
		return bad(column, "%s begins or ends with a space; remove it", quote(s))
	}
	return nil
}

func checkText(column, s string) error {
	if !utf8.ValidString(s) {
		return bad(column, "%s is not UTF-8 text", quote(s))
	}
	i := strings.IndexFunc(s, func(r rune) bool { return unicode.IsControl(r) && r != '\n' && r != '\t' })
	if i >= 0 {
		return bad(column, "it has a control character (%U) after %s; only tabs and line feeds may stand in a text", []rune(s[i:])[0], quote(s[:i]))
	}
	return nil
}

// quote shows a text in an error, shortened where it is long.
func quote(s string) string {
	const most = 60
	if len(s) <= most {
		return strconv.Quote(s)
	}
	cut := most
	for cut > 0 && !utf8.RuneStart(s[cut]) {
		cut--
	}
	return strconv.Quote(s[:cut]) + "..."
}

// onColumn is the column a failed Check blames, "" where it blames none.
func onColumn(err error) (string, error) {
	var b *badField
	if errors.As(err, &b) {
		return b.column, b.err
	}
	return "", err
}
