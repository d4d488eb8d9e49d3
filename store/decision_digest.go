package store

import (
	"cmp"
	"slices"
	"strconv"
	"strings"

	"ringbook/snubber"
)

// TrialsDigest is the SHA-256 (FIPS 180-4), in lower-case hexadecimal, of a canonical text of the trials. It is the same
// in whatever order they come, and another when anything logged of them is another. A strike is not part of it: a trial
// that is struck stays what it was.
//
// The text is UTF-8 in lines that end with a line feed. The first is "ringbook trials 1". The trials follow in the order
// of their ids, each as the line "trial ID" and a line "NAME VALUE" for each of
//
//	board revision session at network c c_tol r r_tol esr measured_c measured_c_u probe_c bus_v current_a switching_hz
//	part note
//
// in this order, where it is stated. Then, in the order of the quantities' names, each reading: "reading QUANTITY VALUE",
// and where there are any, "u VALUE", "instrument TEXT", "from waveform" where it was computed from one, and "repeat VALUE"
// for each single value in the order read. The samples of waveforms are not part of it: the readings are what was used.
//
// Numbers are unscaled SI in the shortest decimal form that reads back as the same float64, as in the CSV, and a negative
// zero is 0; at is RFC 3339 in UTC with nine decimals; in texts \ is written \\ and a line feed \n.
func TrialsDigest(trials []snubber.Trial) string {
	var d Digester
	for i := range trials {
		d.Add(&trials[i])
	}
	return d.Sum()
}

// appendTrial appends the lines of one trial.
func appendTrial(b []byte, t *snubber.Trial) []byte {
	n, p := &t.Network, t.Point
	b = append(append(append(b, "trial "...), t.ID...), '\n')
	b = line(b, "board", t.Board)
	b = line(b, "revision", t.Revision)
	b = line(b, "session", t.Session)
	if !t.At.IsZero() {
		b = line(b, "at", timeText(t.At))
	}
	b = line(b, "network", string(n.Kind))
	b = numberLine(b, "c", n.C)
	b = numberLine(b, "c_tol", n.CTol)
	b = numberLine(b, "r", n.R)
	b = numberLine(b, "r_tol", n.RTol)
	b = numberLine(b, "esr", n.ESR)
	b = numberLine(b, "measured_c", n.MeasuredC)
	b = numberLine(b, "measured_c_u", n.MeasuredU)
	b = numberLine(b, "probe_c", t.ProbeC)
	b = numberLine(b, "bus_v", p.BusV)
	b = numberLine(b, "current_a", p.CurrentA)
	b = numberLine(b, "switching_hz", p.SwitchingHz)
	b = line(b, "part", t.Part)
	b = line(b, "note", t.Note)
	byName := func(x, y snubber.Reading) int { return cmp.Compare(x.Quantity, y.Quantity) }
	readings := t.Readings
	if !slices.IsSortedFunc(readings, byName) {
		readings = slices.SortedStableFunc(slices.Values(readings), byName)
	}
	for i := range readings {
		r := &readings[i]
		b = append(append(append(b, "reading "...), r.Quantity...), ' ')
		b = append(decimal(b, r.Value), '\n')
		b = numberLine(b, "u", r.U)
		b = line(b, "instrument", r.Instrument)
		if r.FromWaveform {
			b = line(b, "from", "waveform")
		}
		for _, v := range r.Repeats {
			b = append(decimal(append(b, "repeat "...), v), '\n')
		}
	}
	return b
}

// line appends "NAME VALUE", where there is a value.
func line(b []byte, name, value string) []byte {
	if value == "" {
		return b
	}
	b = append(append(b, name...), ' ')
	if strings.ContainsAny(value, "\\\n") {
		value = oneLine.Replace(value)
	}
	return append(append(b, value...), '\n')
}

var oneLine = strings.NewReplacer(`\`, `\\`, "\n", `\n`)

// numberLine appends "NAME VALUE", where the value is stated.
func numberLine(b []byte, name string, value float64) []byte {
	if value == 0 {
		return b
	}
	return append(decimal(append(append(b, name...), ' '), value), '\n')
}

// decimal writes a number as the CSV does; SQLite keeps no negative zero.
func decimal(b []byte, v float64) []byte {
	if v == 0 {
		v = 0
	}
	return strconv.AppendFloat(b, v, 'g', -1, 64)
}
