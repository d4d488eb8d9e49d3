package store

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"time"

	"ringbook/snubber"
	"ringbook/snubber/quantity"
)

// column is one column of the CSV: its name, and how a cell goes into a trial and comes out of it. An empty cell is not
// set, and what is not stated comes out empty.
type column struct {
	name string
	set  func(t *snubber.Trial, cell string) error
	get  func(t *snubber.Trial) string
}

// columns are the CSV's columns in the order WriteCSV writes them: those of trial_table, and after them what a trial may
// have besides. A column that qualifies another (ring_hz_u) comes after it.
func columns() []column {
	all := []column{
		text("board", func(t *snubber.Trial) *string { return &t.Board }),
		text("revision", func(t *snubber.Trial) *string { return &t.Revision }),
		{"network", setNetwork, func(t *snubber.Trial) string { return string(t.Network.Kind) }},
		number64("c", quantity.Capacitance, func(t *snubber.Trial) *float64 { return &t.Network.C }),
		fraction("c_tol", func(t *snubber.Trial) *float64 { return &t.Network.CTol }),
		number64("r", quantity.Resistance, func(t *snubber.Trial) *float64 { return &t.Network.R }),
		fraction("r_tol", func(t *snubber.Trial) *float64 { return &t.Network.RTol }),
		number64("probe_c", quantity.Capacitance, func(t *snubber.Trial) *float64 { return &t.ProbeC }),
		point("bus_v", quantity.Voltage, snubber.BusV, func(t *snubber.Trial) *float64 { return &t.Point.BusV }),
		point("current_a", quantity.Current, snubber.CurrentA, func(t *snubber.Trial) *float64 { return &t.Point.CurrentA }),
		point("switching_hz", quantity.Frequency, snubber.SwitchingHz, func(t *snubber.Trial) *float64 { return &t.Point.SwitchingHz }),
		reading(snubber.RingHz, quantity.Frequency),
		uncertainty(snubber.RingHz, quantity.Frequency),
		reading(snubber.DecayS, quantity.Time),
		uncertainty(snubber.DecayS, quantity.Time),
		reading(snubber.PeakV, quantity.Voltage),
		uncertainty(snubber.PeakV, quantity.Voltage),
		{"at", setAt, getAt},
		text("part", func(t *snubber.Trial) *string { return &t.Part }),
		text("note", func(t *snubber.Trial) *string { return &t.Note }),
	}
	return append(all,
		number64("esr", quantity.Resistance, func(t *snubber.Trial) *float64 { return &t.Network.ESR }),
		number64("measured_c", quantity.Capacitance, func(t *snubber.Trial) *float64 { return &t.Network.MeasuredC }),
		number64("measured_c_u", quantity.Capacitance, func(t *snubber.Trial) *float64 { return &t.Network.MeasuredU }),
		reading(snubber.SupplyA, quantity.Current),
		uncertainty(snubber.SupplyA, quantity.Current),
		reading(snubber.TempC, quantity.Temperature),
		uncertainty(snubber.TempC, quantity.Temperature),
		text("session", func(t *snubber.Trial) *string { return &t.Session }),
		text("struck", func(t *snubber.Trial) *string { return &t.Struck }),
		column{"from_waveform", setFromWaveform, getFromWaveform},
	)
}

func text(name string, field func(*snubber.Trial) *string) column {
	return column{name,
		func(t *snubber.Trial, cell string) error { *field(t) = cell; return nil },
		func(t *snubber.Trial) string { return *field(t) }}
}

func number64(name string, unit quantity.Unit, field func(*snubber.Trial) *float64) column {
	return column{name,
		func(t *snubber.Trial, cell string) (err error) { *field(t), err = parseNumber(cell, unit); return err },
		func(t *snubber.Trial) string { return formatNumber(*field(t)) }}
}

func fraction(name string, field func(*snubber.Trial) *float64) column {
	return column{name,
		func(t *snubber.Trial, cell string) (err error) {
			*field(t), err = quantity.ParseFraction(cell)
			return err
		},
		func(t *snubber.Trial) string { return formatNumber(*field(t)) }}
}

// point is a column of the operating point. Where only an instrument read it, the reading comes out.
func point(name string, unit quantity.Unit, q snubber.Quantity, field func(*snubber.Trial) *float64) column {
	c := number64(name, unit, field)
	c.get = func(t *snubber.Trial) string {
		v := *field(t)
		if v == 0 {
			r, _ := t.Reading(q)
			v = r.Value
		}
		return formatNumber(v)
	}
	return c
}

func reading(q snubber.Quantity, unit quantity.Unit) column {
	return column{string(q),
		func(t *snubber.Trial, cell string) error {
			v, err := parseNumber(cell, unit)
			t.Readings = append(t.Readings, snubber.Reading{Quantity: q, Value: v})
			return err
		},
		func(t *snubber.Trial) string {
			if r, ok := t.Reading(q); ok {
				return strconv.FormatFloat(r.Value, 'g', -1, 64)
			}
			return ""
		}}
}

func uncertainty(q snubber.Quantity, unit quantity.Unit) column {
	return column{string(q) + "_u",
		func(t *snubber.Trial, cell string) error {
			u, err := parseNumber(cell, unit)
			if err != nil {
				return err
			}
			for i := range t.Readings {
				if t.Readings[i].Quantity == q {
					t.Readings[i].U = u
					return nil
				}
			}
			return fmt.Errorf("%s is empty, so there is nothing to be uncertain of; give %s or leave this empty", q, q)
		},
		func(t *snubber.Trial) string {
			r, _ := t.Reading(q)
			return formatNumber(r.U)
		}}
}

func setFromWaveform(t *snubber.Trial, cell string) error {
	for _, name := range strings.Fields(cell) {
		i := slices.IndexFunc(t.Readings, func(r snubber.Reading) bool { return string(r.Quantity) == name })
		if i < 0 {
			return fmt.Errorf("%s has no reading in this row; name readings of the row with spaces between them, such as ring_hz decay_s", quote(name))
		}
		t.Readings[i].FromWaveform = true
	}
	return nil
}

func getFromWaveform(t *snubber.Trial) string {
	var names []string
	for _, r := range t.Readings {
		// Those of the operating point come out as the point.
		if r.FromWaveform && r.Quantity != snubber.BusV && r.Quantity != snubber.CurrentA && r.Quantity != snubber.SwitchingHz {
			names = append(names, string(r.Quantity))
		}
	}
	slices.Sort(names) // as trial_table has them
	return strings.Join(names, " ")
}

func setNetwork(t *snubber.Trial, cell string) (err error) {
	t.Network.Kind, err = snubber.ParseKind(cell)
	return err
}

func setAt(t *snubber.Trial, cell string) error {
	at, err := time.Parse(time.RFC3339, cell)
	if err != nil {
		return errors.New("it must be a time as RFC 3339 writes it, such as 2026-03-01T09:30:00Z or 2026-03-01T10:30:00+01:00")
	}
	if at.IsZero() {
		return errors.New("the year 1; it must lie from 1900 to 9999")
	}
	t.At = at.UTC()
	return nil
}

func getAt(t *snubber.Trial) string {
	if t.At.IsZero() {
		return ""
	}
	return t.At.UTC().Format(time.RFC3339Nano)
}

// parseNumber reads a plain SI number at once, and leaves all else to quantity.
func parseNumber(cell string, unit quantity.Unit) (float64, error) {
	if strings.Trim(cell, "0123456789+-.eE") == "" {
		if v, err := strconv.ParseFloat(cell, 64); err == nil && (v >= 0 || unit.Signed()) && !math.IsInf(v, 0) {
			return v, nil
		}
	}
	return quantity.Parse(cell, unit)
}

// formatNumber is v in the shortest form that reads back as the same float64; empty for 0, which is "not stated".
func formatNumber(v float64) string {
	if v == 0 {
		return ""
	}
	return strconv.FormatFloat(v, 'g', -1, 64)
}
