package store

import (
	"cmp"
	"crypto/sha256"
	"encoding/hex"
	"io"
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
	texts := make([]string, len(trials))
	for i := range trials {
		texts[i] = canonical(&trials[i])
	}
	slices.Sort(texts) // each begins with its trial's id, and all ids are of one length
	h := sha256.New()
	io.WriteString(h, "ringbook trials 1\n") // a hash takes every write
	for _, text := range texts {
		io.WriteString(h, text)
	}
	return hex.EncodeToString(h.Sum(nil))
}

var oneLine = strings.NewReplacer(`\`, `\\`, "\n", `\n`)

func canonical(t *snubber.Trial) string {
	var b strings.Builder
	line := func(name, value string) {
		b.WriteString(name + " " + value + "\n")
	}
	text := func(name, value string) {
		if value != "" {
			line(name, oneLine.Replace(value))
		}
	}
	number := func(name string, value float64) {
		if value != 0 {
			line(name, decimal(value))
		}
	}
	n, p := t.Network, t.Point
	line("trial", t.ID)
	text("board", t.Board)
	text("revision", t.Revision)
	text("session", t.Session)
	if !t.At.IsZero() {
		line("at", timeText(t.At))
	}
	text("network", string(n.Kind))
	number("c", n.C)
	number("c_tol", n.CTol)
	number("r", n.R)
	number("r_tol", n.RTol)
	number("esr", n.ESR)
	number("measured_c", n.MeasuredC)
	number("measured_c_u", n.MeasuredU)
	number("probe_c", t.ProbeC)
	number("bus_v", p.BusV)
	number("current_a", p.CurrentA)
	number("switching_hz", p.SwitchingHz)
	text("part", t.Part)
	text("note", t.Note)
	readings := slices.SortedStableFunc(slices.Values(t.Readings), func(a, b snubber.Reading) int {
		return cmp.Compare(a.Quantity, b.Quantity)
	})
	for _, r := range readings {
		line("reading", string(r.Quantity)+" "+decimal(r.Value))
		number("u", r.U)
		text("instrument", r.Instrument)
		if r.FromWaveform {
			line("from", "waveform")
		}
		for _, v := range r.Repeats {
			line("repeat", decimal(v))
		}
	}
	return b.String()
}

// decimal writes a number as the CSV does; SQLite keeps no negative zero.
func decimal(v float64) string {
	if v == 0 {
		v = 0
	}
	return strconv.FormatFloat(v, 'g', -1, 64)
}
