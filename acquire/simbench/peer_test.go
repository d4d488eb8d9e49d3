package simbench

import (
	"bytes"
	"encoding/json"
	"math"
	"os"
	"os/exec"
	"strings"
	"testing"
)

// TestPeer lets a client that nobody of this project wrote speak to the bench: PyVISA 1.11 with PyVISA-py 0.5 (Debian's
// python3-pyvisa, python3-pyvisa-py, python3-serial), over a socket and over a pseudo-terminal. It is run by the Python
// that RINGBOOK_PYTHON names, /usr/bin/python3 where that is not set; where it is missing the test is skipped, unless
// RINGBOOK_CHECKS is "all".
func TestPeer(t *testing.T) {
	python := os.Getenv("RINGBOOK_PYTHON")
	if python == "" {
		python = "/usr/bin/python3"
	}
	if msg, err := exec.Command(python, "-c", "import pyvisa, pyvisa_py, serial").CombinedOutput(); err != nil {
		if os.Getenv("RINGBOOK_CHECKS") == "all" {
			t.Fatalf("PyVISA is needed for this check: install Debian's python3-pyvisa, python3-pyvisa-py and python3-serial (%v: %s)", err, msg)
		}
		t.Skip("PyVISA is not installed: Debian's python3-pyvisa, python3-pyvisa-py and python3-serial have it")
	}
	for name, resource := range map[string]func(b *Bench, instrument string) string{
		"socket": func(b *Bench, instrument string) string {
			host, port, _ := strings.Cut(strings.TrimPrefix(b.Address(instrument), "tcp://"), ":")
			return "TCPIP::" + host + "::" + port + "::SOCKET"
		},
		"serial": func(b *Bench, instrument string) string {
			path, err := b.ServePTY(instrument)
			if err != nil {
				t.Fatal(err)
			}
			return "ASRL" + path + "::INSTR"
		},
	} {
		t.Run(name, func(t *testing.T) {
			b := started(t)
			in, err := json.Marshal(map[string]string{"scope": resource(b, "scope"), "supply": resource(b, "supply")})
			if err != nil {
				t.Fatal(err)
			}
			cmd := exec.CommandContext(t.Context(), python, "testdata/peer.py")
			cmd.Stdin = bytes.NewReader(in)
			var stderr bytes.Buffer
			cmd.Stderr = &stderr
			out, err := cmd.Output()
			if err != nil {
				t.Fatalf("%v\n%s", err, stderr.Bytes())
			}
			var said struct {
				Supply, Two, Refused, Empty, Silence, Scope, Preamble, Errors string

				AfterSilence string    `json:"after_silence"`
				AfterUint8   string    `json:"after_uint8"`
				AfterReal    string    `json:"after_real"`
				BusV         []float64 `json:"bus_v"`
				RingHz       []float64 `json:"ring_hz"`
				Uint8        []float64
				Real         []float64
				Int16        []float64
				ASCII        []float64 `json:"ascii"`
			}
			if err := json.Unmarshal(out, &said); err != nil {
				t.Fatalf("%v in %.200q", err, out)
			}
			for what, c := range map[string][2]string{
				"the supply's identity":    {said.Supply, "RINGBOOK,SIMULATED SUPPLY,0,1"},
				"the scope's identity":     {said.Scope, "RINGBOOK,SIMULATED SCOPE,0,1"},
				"two queries at once":      {said.Two, "1;1"},
				"a header that is none":    {said.Refused, `-113,"Undefined header;OUTPut:STATE:NONSENSE"`},
				"the queue after it":       {said.Empty, `0,"No error"`},
				"a reply that is none":     {said.Silence, "VI_ERROR_TMO"},
				"the reply after that":     {said.AfterSilence, "1"},
				"the reply after bytes":    {said.AfterUint8, "1"},
				"the reply after floats":   {said.AfterReal, "1"},
				"the scope's queue, ended": {said.Errors, `0,"No error"`},
			} {
				if c[0] != c[1] {
					t.Errorf("%s: %q, want %q", what, c[0], c[1])
				}
			}
			if len(said.BusV) != 1 || math.Abs(said.BusV[0]-48) > 0.1 {
				t.Errorf("bus %v V", said.BusV)
			}
			if len(said.RingHz) != 1 || math.Abs(said.RingHz[0]-87.8e6) > 0.3e6 {
				t.Errorf("ring %v Hz", said.RingHz)
			}
			if !strings.HasPrefix(said.Preamble, "2000,") {
				t.Errorf("preamble %q", said.Preamble)
			}
			c := kept(b)
			volts := c.Volts()
			for what, got := range map[string][]float64{"bytes": said.Uint8, "floats": said.Real, "words": said.Int16, "text": said.ASCII} {
				if len(got) != len(c.Codes) {
					t.Errorf("%d samples as %s, want %d", len(got), what, len(c.Codes))
				}
			}
			if t.Failed() {
				return
			}
			feeds := 0
			for i, code := range c.Codes {
				if said.Uint8[i] != float64(code) || said.Int16[i] != float64(int(code)-128)*256 || said.Real[i] != float64(float32(volts[i])) || said.ASCII[i] != volts[i] {
					t.Fatalf("sample %d, %g V, came as %g, %g, %g and %g", i, volts[i], said.Uint8[i], said.Int16[i], said.Real[i], said.ASCII[i])
				}
				bits := math.Float32bits(float32(volts[i]))
				for range 4 {
					if bits&0xff == '\n' {
						feeds++
					}
					bits >>= 8
				}
			}
			if feeds == 0 { // or the terminator inside a block was never tried
				t.Error("there is no line feed inside the block of floats")
			}
		})
	}
}
