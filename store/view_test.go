package store

import (
	"strconv"
	"strings"
	"testing"

	"ringbook/snubber/waveform"
)

// TestTheView compares trial_table with the CSV: the same columns, the same values.
func TestTheView(t *testing.T) {
	lb := openTemp(t)
	full := example()
	full.Struck = "probe fell off"
	full.Readings[0].FromWaveform, full.Readings[2].FromWaveform = true, true
	read := example() // an operating point read by instruments alone
	read.Point.BusV, read.Readings = 0, append(read.Readings[:1:1], example().Readings[2])
	read.Readings = append(read.Readings, example().Readings[3])
	read.Readings[2].Quantity, read.Readings[2].Value = "bus_v", 47.5
	bare := example()
	bare.Network, bare.Readings, bare.Point, bare.ProbeC, bare.Part, bare.Note = example().Network, nil, example().Point, 0, "", ""
	if _, err := lb.AddWithWaveforms(t.Context(), full, []waveform.Record{captured(10)}); err != nil {
		t.Fatal(err)
	}
	mustAdd(t, lb, read)
	mustAdd(t, lb, bare)

	// The contract: the columns of interface.md, in its order, between the id and what was added since.
	const contract = "id board revision network c c_tol r r_tol probe_c bus_v current_a switching_hz " +
		"ring_hz ring_hz_u decay_s decay_s_u peak_v peak_v_u at part note struck waveforms from_waveform"
	rows, err := lb.db.QueryContext(t.Context(), `SELECT * FROM trial_table`)
	if err != nil {
		t.Fatal(err)
	}
	defer rows.Close()
	names, err := rows.Columns()
	if err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(names, " "); got != contract {
		t.Fatalf("columns\n%s\nwant\n%s", got, contract)
	}
	seen := 0
	for rows.Next() {
		cells := make([]any, len(names))
		into := make([]any, len(names))
		for i := range cells {
			into[i] = &cells[i]
		}
		if err := rows.Scan(into...); err != nil {
			t.Fatal(err)
		}
		trial, err := lb.Trial(t.Context(), cells[0].(string))
		if err != nil {
			t.Fatal(err)
		}
		row := map[string]any{}
		for i, name := range names {
			row[name] = cells[i]
		}
		for _, col := range columns() {
			cell, ok := row[col.name]
			want := col.get(&trial)
			if !ok {
				continue // a column of the CSV alone
			}
			got := ""
			switch v := cell.(type) {
			case string:
				got = v
			case float64:
				got = strconv.FormatFloat(v, 'g', -1, 64)
			}
			if col.name == "at" {
				want = timeText(trial.At)
			}
			if got != want {
				t.Errorf("trial %s: %s = %v, want %q", trial.ID, col.name, cell, want)
			}
			if want == "" && cell != nil {
				t.Errorf("trial %s: %s = %v, want NULL", trial.ID, col.name, cell)
			}
		}
		if want := int64(len(waveforms(t, lb, trial.ID))); row["waveforms"] != want {
			t.Errorf("trial %s: waveforms = %v, want %d", trial.ID, row["waveforms"], want)
		}
		seen++
	}
	if rows.Err() != nil || seen != 3 {
		t.Errorf("%d rows, %v", seen, rows.Err())
	}
	var columnsOfCSV []string
	for _, col := range columns()[:20] {
		columnsOfCSV = append(columnsOfCSV, col.name)
	}
	if got := "id " + strings.Join(columnsOfCSV, " ") + " struck waveforms from_waveform"; got != contract {
		t.Errorf("the CSV's first columns are\n%s", got)
	}
}
