package simbench

import (
	"math"
	"slices"
	"strings"
	"testing"

	"ringbook/acquire"
)

// kept is the capture the scope handed out last.
func kept(b *Bench) Capture {
	b.mu.Lock()
	defer b.mu.Unlock()
	return *b.kept
}

// TestEveryFormat: the program's own client, which shares no code with the scope here, gets the volts that the scope's
// converter stood for, in each format, over TCP.
func TestEveryFormat(t *testing.T) {
	b := started(t)
	rig := b.RigTOML()
	for name, c := range map[string]struct {
		set, format string
		tolerance   float64 // V
		step        bool    // the converter's step is told
	}{
		"uint8":         {"UINTeger,8", `"uint8"`, 0, true},
		"int8":          {"INTeger,8", `"int8"`, 0, true},
		"uint16 big":    {"UINTeger,16", "\"uint16\"\nbyte_order = \"big\"", 0, true},
		"uint16 little": {"UINTeger,16;:CAPT:FORM:BORD SWAP", "\"uint16\"\nbyte_order = \"little\"", 0, true},
		"int16 big":     {"INTeger,16", "\"int16\"\nbyte_order = \"big\"", 0, true},
		"int16 little":  {"INTeger,16;:CAPT:FORM:BORD SWAP", "\"int16\"\nbyte_order = \"little\"", 0, true},
		"float32":       {"REAL,32", "\"float32\"\nbyte_order = \"big\"", 1e-5, false},
		"ascii":         {"ASCii", `"ascii"`, 0, false},
	} {
		t.Run(name, func(t *testing.T) {
			text := strings.Replace(rig, `"uint8"`, c.format, 1)
			if !c.step {
				text = strings.Replace(text, `"zero_v", "volt_per_code", "zero_code"`, `"-", "-", ""`, 1)
			}
			described, err := acquire.ParseRig("rig.toml", []byte(text))
			if err != nil {
				t.Fatal(err)
			}
			scope := dial(t, b, "scope")
			scope.do("*RST;:CAPTure:FORMat " + c.set)
			station, err := acquire.Open(t.Context(), described)
			if err != nil {
				t.Fatal(err)
			}
			defer station.Close()
			for range 2 {
				records, err := station.Capture(t.Context(), 1)
				if err != nil {
					t.Fatal(err)
				}
				r, kept := records[0], kept(b)
				want := kept.Volts()
				if len(r.Volts) != len(want) || r.Start != kept.StartS || r.Interval != kept.StepS || r.Origin != "RINGBOOK,SIMULATED SCOPE,0,1" {
					t.Fatalf("%d samples from %g s every %g s of %q; want %d, %g s, %g s", len(r.Volts), r.Start, r.Interval, r.Origin, len(want), kept.StartS, kept.StepS)
				}
				if step := map[bool]float64{true: kept.VoltsPerBit}[c.step]; r.StepV != step {
					t.Errorf("step %g V; want %g", r.StepV, step)
				}
				for i, v := range want {
					if math.Abs(r.Volts[i]-v) > c.tolerance {
						t.Fatalf("sample %d is %.17g V; want %.17g", i+1, r.Volts[i], v)
					}
				}
			}
			many, err := station.Capture(t.Context(), 3)
			if err != nil || len(many) != 3 {
				t.Fatalf("%d records, %v", len(many), err)
			}
			for i, v := range kept(b).Volts() {
				if math.Abs(many[2].Volts[i]-v) > c.tolerance {
					t.Fatalf("of three captures, the last is not the last: sample %d", i+1)
				}
			}
			if got, err := station.Take(t.Context(), nil); err != nil || len(got.Readings) != 8 {
				t.Errorf("readings after the captures: %+v, %v", got, err)
			}
		})
	}
}

// TestCaptureOverSerial: bytes of every value come through a pseudo-terminal too.
func TestCaptureOverSerial(t *testing.T) {
	b := started(t)
	path, err := b.ServePTY("scope")
	if err != nil {
		t.Fatal(err)
	}
	text := strings.Replace(b.RigTOML(), b.Address("scope"), "serial://"+path, 1)
	text = strings.Replace(text, `"uint8"`, "\"int16\"\nbyte_order = \"little\"", 1)
	text = strings.Replace(text, `take            = "CAPTure"`, `take = ["CAPTure:FORMat INTeger,16", "CAPTure:FORMat:BORDer SWAPped", "CAPTure", "*OPC?"]`, 1)
	rig, err := acquire.ParseRig("rig.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	station, err := acquire.Open(t.Context(), rig)
	if err != nil {
		t.Fatal(err)
	}
	defer station.Close()
	records, err := station.Capture(t.Context(), 4)
	if err != nil {
		t.Fatal(err)
	}
	if !slices.Equal(records[3].Volts, kept(b).Volts()) || records[3].StepV != kept(b).VoltsPerBit {
		t.Errorf("%d samples with a step of %g V are not the scope's", len(records[3].Volts), records[3].StepV)
	}
}

// TestFormatCommands: what is set reads back, in the short form, and what cannot be set is refused.
func TestFormatCommands(t *testing.T) {
	b := started(t)
	scope := dial(t, b, "scope")
	for set, want := range map[string]string{
		"asc": "ASC", "ASCII,0": "ASC", "INT": "INT,8", "INTEGER,16": "INT,16", "UINT,16": "UINT,16", "real": "REAL,32",
	} {
		if got := scope.ask("CAPT:FORM " + set + ";FORM?"); got != want {
			t.Errorf("%s reads back as %q, want %q", set, got, want)
		}
	}
	if got := scope.ask("CAPT:FORM:BORD SWAPped;BORD?"); got != "SWAP" {
		t.Errorf("byte order %q", got)
	}
	for _, set := range []string{"HEX", "INT,32", "INT,8.5", "REAL,64", "REAL,1E300", "5", "INT,X", ":BORD LEFT"} {
		scope.send("CAPT:FORM" + map[bool]string{true: "", false: " "}[set[0] == ':'] + set)
		if got := scope.ask("SYST:ERR?"); !strings.HasPrefix(got, "-224,") && !strings.HasPrefix(got, "-104,") {
			t.Errorf("%s: %s", set, got)
		}
	}
	if got := scope.ask("CAPT:FORM?;:CAPT:FORM:BORD?"); !strings.HasSuffix(got, ";SWAP") {
		t.Errorf("after the refusals: %q", got)
	}
	if got := scope.ask("*RST;:CAPT:FORM?;:CAPT:FORM:BORD?"); got != "UINT,8;NORM" {
		t.Errorf("after a reset: %q", got)
	}
}
