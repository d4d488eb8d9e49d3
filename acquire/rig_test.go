package acquire_test

import (
	"bytes"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"ringbook/acquire"
	"ringbook/snubber"
)

func TestLoadRig(t *testing.T) {
	got, err := acquire.LoadRig("testdata/rig.toml")
	if err != nil {
		t.Fatal(err)
	}
	want := acquire.Rig{Instruments: []acquire.Instrument{
		{
			Name: "counter", Address: "TCPIP::192.0.2.11::5025::SOCKET", Reopen: time.Minute,
			Readings: []acquire.Query{{Quantity: snubber.SwitchingHz, Query: "MEASure:FREQuency?", Accuracy: acquire.Accuracy{Percent: 0.005}}},
		},
		{Name: "jig", Address: "tcp://192.0.2.12", NoErrorQueue: true, NoSelfTest: true, Fit: "ROUTe:NETWork {network},{c},{r}"},
		{
			Name: "load", Address: "tcp://192.0.2.13:5025", NoSelfTest: true,
			Readings: []acquire.Query{{Quantity: snubber.CurrentA, Query: "MEASure:CURRent:DC?", Accuracy: acquire.Accuracy{Percent: 0.1, Fixed: 0.005}}},
		},
		{
			Name: "meter", Address: "serial:///dev/ttyUSB1?baud=9600&parity=even&data=7", Prompt: ">", Echo: true,
			Readings: []acquire.Query{{Quantity: snubber.BusV, Query: "READ?", Accuracy: acquire.Accuracy{Percent: 0.1, Fixed: 0.02}, Repeats: 3}},
		},
		{
			Name: "scope", Address: "tcp://192.0.2.10:5025", Timeout: 8 * time.Second, Setup: []string{"*CLS", "MEASure:SOURce CHANnel1"},
			Readings: []acquire.Query{
				{Quantity: snubber.DecayS, Query: "MEASure:DTIMe?"},
				{Quantity: snubber.PeakV, Query: "MEASure:VMAX?", Scale: 10, Accuracy: acquire.Accuracy{Percent: 2, Fixed: 0.4}},
				{Quantity: snubber.RingHz, Query: "MEASure:FREQuency?", Accuracy: acquire.Accuracy{Percent: 0.01}, Repeats: 10},
			},
			Waveform: &acquire.Waveform{
				Take: []string{"CAPTure", "*OPC?"}, Query: "CAPTure:DATA?", Format: acquire.Int16, ByteOrder: acquire.Big, Preamble: "CAPTure:PREamble?",
				PreambleFields: []string{"points", "-", "interval_s", "start_s", "start_sample", "volt_per_code", "zero_v"},
				Scaling:        map[string]acquire.Scaler{"zero_code": {Query: "CAPTure:ZERO:CODE?"}}, Scale: 10, Accuracy: acquire.Accuracy{Percent: 2, Fixed: 0.4},
			},
		},
		{
			Name: "supply", Address: "serial:///dev/ttyUSB0?baud=115200", Terminator: "\r\n", Pace: 20 * time.Millisecond, NoSelfTest: true,
			Output:   &acquire.BusSwitch{On: []string{"VOLTage 48", "OUTPut ON"}, Off: []string{"OUTPut OFF"}, State: "OUTPut?", Settle: 300 * time.Millisecond},
			Readings: []acquire.Query{{Quantity: snubber.SupplyA, Query: "MEASure:CURRent:DC?", Accuracy: acquire.Accuracy{Percent: 0.2, Fixed: 0.005}}},
		},
		{
			Name: "thermometer", Address: "tcp://192.0.2.14:5025",
			Readings: []acquire.Query{{Quantity: snubber.TempC, Query: "MEASure:TEMPerature? TCouple,K", Accuracy: acquire.Accuracy{Fixed: 1.5}, Repeats: 1}},
		},
	}}
	if d := cmp.Diff(want, got); d != "" {
		t.Error(d)
	}
}

// The example of the package comment is the file in testdata, line for line.
func TestDocumentedRig(t *testing.T) {
	doc, err := os.ReadFile("doc.go")
	if err != nil {
		t.Fatal(err)
	}
	rig, err := os.ReadFile("testdata/rig.toml")
	if err != nil {
		t.Fatal(err)
	}
	var want bytes.Buffer
	for line := range strings.Lines(string(rig)) {
		if line != "\n" {
			want.WriteString("//\t")
		} else {
			want.WriteString("//")
		}
		want.WriteString(line)
	}
	if !bytes.Contains(doc, want.Bytes()) {
		t.Errorf("doc.go does not hold testdata/rig.toml as it stands:\n%s", want.String())
	}
}

func TestRigErrors(t *testing.T) {
	const good = `[instrument.scope]
address = "tcp://192.0.2.10"

[instrument.scope.reading.ring_hz]
query = "MEASure:FREQuency?"
`
	const wave = good + `
[instrument.scope.waveform]
query = "CAPTure:DATA?"
format = "uint8"
interval_s = 1e-9
volt_per_code = 0.5
`
	with := func(old, new string) string { return strings.Replace(wave, old, new, 1) }
	top := func(line string) string { return strings.Replace(good, "\n\n", "\n"+line+"\n\n", 1) }
	output := func(lines string) string { return good + "[instrument.scope.output]\n" + lines }
	for name, c := range map[string]struct{ text, want string }{
		"waveform key":         {wave + "points = 5\n", "line 12: instrument.scope.waveform.points: there is no such key: a waveform has take, query, format, byte_order, preamble, preamble_fields, scale, accuracy, start_s, start_sample, interval_s, zero_v, zero_code, volt_per_code"},
		"waveform no query":    {with("query = \"CAPTure:DATA?\"\n", ""), "line 7: instrument.scope.waveform: its query is missing"},
		"waveform query":       {with("DATA?", "DATA"), `line 8: instrument.scope.waveform.query: "CAPTure:DATA" is no query`},
		"waveform two queries": {with("DATA?", "DATA?;*RST"), "line 8: instrument.scope.waveform.query: message"},
		"waveform no format":   {with("format = \"uint8\"\n", ""), "line 7: instrument.scope.waveform: its format is missing: give int8, uint8, int16"},
		"waveform format":      {with("uint8", "byte"), `line 9: instrument.scope.waveform.format: "byte": it must be int8, uint8, int16, uint16, float32 or ascii`},
		"no byte order":        {with("uint8", "int16"), "line 7: instrument.scope.waveform: its byte_order is missing: int16 needs big"},
		"byte order":           {with("uint8", "int16") + "byte_order = \"pdp\"\n", `line 12: instrument.scope.waveform.byte_order: "pdp": it must be big, the most`},
		"byte order of a byte": {wave + "byte_order = \"big\"\n", "line 12: instrument.scope.waveform.byte_order: uint8 has none: take the key out"},
		"byte order of text":   {with("uint8", "ascii") + "byte_order = \"big\"\n", "ascii has none"},
		"interval 0":           {with("1e-9", "0"), "line 10: instrument.scope.waveform.interval_s: 0: the time between two samples must be above zero"},
		"interval negative":    {with("1e-9", "-1e-9"), "interval_s: -1e-09: the time"},
		"interval nan":         {with("1e-9", "nan"), "line 10: instrument.scope.waveform.interval_s: NaN: it must be a finite number"},
		"interval nowhere":     {with("interval_s = 1e-9\n", ""), "line 7: instrument.scope.waveform: its interval_s is not known: give a number, a query as in"},
		"interval true":        {with("1e-9", "true"), "line 10: instrument.scope.waveform.interval_s: true: it must be a number, or the query"},
		"interval empty":       {with("1e-9", "\"\""), "line 10: instrument.scope.waveform.interval_s: it is empty"},
		"interval no query":    {with("1e-9", "\"CAPTure:STEP\""), `line 10: instrument.scope.waveform.interval_s: "CAPTure:STEP" is no query`},
		"volts 0":              {with("0.5", "0"), "line 11: instrument.scope.waveform.volt_per_code: 0: every sample would be the same voltage"},
		"volts nowhere":        {with("volt_per_code = 0.5\n", ""), "line 7: instrument.scope.waveform: its volt_per_code is not known"},
		"waveform scale 0":     {wave + "scale = 0\n", "line 12: instrument.scope.waveform.scale: 0: every sample would be nothing"},
		"waveform scale inf":   {wave + "scale = inf\n", "waveform.scale: +Inf: it must be a finite number"},
		"take a number":        {wave + "take = 5\n", "line 12: instrument.scope.waveform.take: 5 is no message: write it in quotes"},
		"take numbers":         {wave + "take = [5]\n", "line 12: instrument.scope.waveform.take: 5 is no message: write each in quotes"},
		"take two in one":      {wave + "take = \"STOP;*OPC?\"\n", "line 12: instrument.scope.waveform.take: message"},
		"take empty":           {wave + "take = \"\"\n", "line 12: instrument.scope.waveform.take: "},
		"fields alone":         {wave + "preamble_fields = [\"points\"]\n", "line 12: instrument.scope.waveform.preamble_fields: there is no preamble whose fields they are"},
		"preamble alone":       {wave + "preamble = \"CAPTure:PREamble?\"\n", "line 12: instrument.scope.waveform.preamble: its preamble_fields name nothing"},
		"preamble no query":    {wave + "preamble = \"CAPTure:PREamble\"\npreamble_fields = [\"points\"]\n", "line 12: instrument.scope.waveform.preamble: \"CAPTure:PREamble\" is no query"},
		"fields of no use":     {wave + "preamble = \"P?\"\npreamble_fields = [\"-\", \"\"]\n", "name nothing"},
		"field unknown":        {wave + "preamble = \"P?\"\npreamble_fields = [\"xincr\"]\n", `line 13: instrument.scope.waveform.preamble_fields: "xincr" is no field: there are points, start_s`},
		"field twice":          {wave + "preamble = \"P?\"\npreamble_fields = [\"zero_v\", \"-\", \"zero_v\"]\n", "line 13: instrument.scope.waveform.preamble_fields: zero_v stands there twice"},
		"field and number":     {wave + "preamble = \"P?\"\npreamble_fields = [\"interval_s\"]\n", "line 10: instrument.scope.waveform.interval_s: the preamble has it already"},
		"two waveforms":        {wave + strings.ReplaceAll(wave[len(good):], "scope", "probe") + "[instrument.probe]\naddress = \"tcp://192.0.2.11\"\n", "waveform: probe takes the waveform already"},
		"empty":                {"", "rig.toml: no instrument provides a reading"},
		"not toml":             {"[instrument.scope\n", "rig.toml, line 2"},
		"key twice":            {"[instrument.a]\naddress = \"x\"\naddress = \"y\"\n", "line 3"},
		"unknown table":        {good + "\n[scope]\n", "line 7: scope: there is no such key: the file holds [instrument.NAME] tables"},
		"unknown key":          {strings.Replace(good, "\n\n", "\nadress = \"x\"\n\n", 1), "line 3: instrument.scope.adress: there is no such key: an instrument has address"},
		"unknown reading key":  {good + "repeat = 5\n", "line 6: instrument.scope.reading.ring_hz.repeat: there is no such key: a reading has query"},
		"unknown accuracy":     {good + "accuracy = { percent = 1, range = 2 }\n", "line 6: instrument.scope.reading.ring_hz.accuracy.range: there is no such key: accuracy has"},
		"unknown quantity":     {strings.Replace(good, "ring_hz", "ring_mhz", 1), `line 4: instrument.scope.reading.ring_mhz: "ring_mhz" is no reading: there are ring_hz, decay_s`},
		"wrong type":           {good + "repeats = \"five\"\n", "line 6"},
		"address of no kind":   {strings.Replace(good, "tcp://192.0.2.10", "192.0.2.10:5025", 1), `line 2: instrument.scope.address: address "192.0.2.10:5025": it must begin with tcp://`},
		"no address":           {"[instrument.scope.reading.ring_hz]\nquery = \"F?\"\n", "instrument.scope: its address is missing"},
		"no query":             {strings.Replace(good, "query = \"MEASure:FREQuency?\"\n", "", 1), "line 4: instrument.scope.reading.ring_hz: its query is missing"},
		"no question":          {strings.Replace(good, "FREQuency?", "FREQuency", 1), `line 5: instrument.scope.reading.ring_hz.query: "MEASure:FREQuency" is no query`},
		"two in one":           {strings.Replace(good, "FREQuency?", "FREQuency?;*RST", 1), "line 5: instrument.scope.reading.ring_hz.query: message"},
		"scale 0":              {good + "scale = 0\n", "line 6: instrument.scope.reading.ring_hz.scale: 0"},
		"scale inf":            {good + "scale = inf\n", "line 6: instrument.scope.reading.ring_hz.scale: +Inf"},
		"repeats 0":            {good + "repeats = 0\n", "line 6: instrument.scope.reading.ring_hz.repeats: 0"},
		"repeats -1":           {good + "repeats = -1\n", "repeats: -1: it must be 1 to 1000"},
		"accuracy negative":    {good + "accuracy = { percent = -1 }\n", "line 6: instrument.scope.reading.ring_hz.accuracy.percent: -1"},
		"accuracy nan":         {good + "accuracy = { fixed = nan }\n", "accuracy.fixed: NaN"},
		"timeout no unit":      {strings.Replace(good, "\n\n", "\ntimeout = \"5\"\n\n", 1), `line 3: instrument.scope.timeout: "5": write a time`},
		"timeout 0":            {strings.Replace(good, "\n\n", "\ntimeout = \"0s\"\n\n", 1), `timeout: "0s"`},
		"terminator":           {strings.Replace(good, "\n\n", "\nterminator = \"eoi\"\n\n", 1), `line 3: instrument.scope.terminator: "eoi": it must be lf, crlf or cr`},
		"setup":                {strings.Replace(good, "\n\n", "\nsetup = [\"*RST; *CLS\"]\n\n", 1), "line 3: instrument.scope.setup: message"},
		"same reading twice": {good + "[instrument.meter]\naddress = \"tcp://192.0.2.11\"\n[instrument.meter.reading.ring_hz]\nquery = \"READ?\"\n",
			"instrument.scope.reading.ring_hz: meter provides this reading already"},
		"one port twice": {strings.ReplaceAll(good, "tcp://192.0.2.10", "serial:///dev/ttyUSB0") + "[instrument.meter]\naddress = \"ASRL/dev/ttyUSB0::INSTR\"\n",
			"line 2: instrument.scope.address: meter is at this serial port already"},
		"fit without c":     {good + "[instrument.jig]\naddress = \"tcp://192.0.2.12\"\nfit = \"ROUTe:CLOSe\"\n", "line 8: instrument.jig.fit: fit command"},
		"fit unknown brace": {good + "[instrument.jig]\naddress = \"tcp://192.0.2.12\"\nfit = \"ROUTe {c},{l}\"\n", "only {network}, {c} and {r}"},
		"fit empty":         {good + "[instrument.jig]\naddress = \"tcp://192.0.2.12\"\nfit = \"\"\n", "jig.fit: it is empty"},
		"fit query":         {good + "[instrument.jig]\naddress = \"tcp://192.0.2.12\"\nfit = \"ROUTe? {c}\"\n", "a query fits nothing"},
		"fit twice":         {good + "[instrument.jig]\naddress = \"tcp://192.0.2.12\"\nfit = \"R {c}\"\n[instrument.kit]\naddress = \"tcp://192.0.2.12\"\nfit = \"R {c}\"\n", "line 11: instrument.kit.fit: jig fits networks already"},
		"instrument's name": {strings.ReplaceAll(good, "scope", "\"my scope\""), "a name is letters, digits"},
		"pace no unit":      {top("pace = \"20\""), `line 3: instrument.scope.pace: "20": write a time with its unit`},
		"pace negative":     {top("pace = \"-1s\""), "line 3: instrument.scope.pace"},
		"pace too long":     {top("pace = \"2h\""), "line 3: instrument.scope.pace: 2h0m0s: it must be nothing to 1m0s"},
		"reopen":            {top("reopen = \"soon\""), `line 3: instrument.scope.reopen: "soon": write a time with its unit`},
		"prompt empty":      {top("prompt = \" \""), "line 3: instrument.scope.prompt"},
		"prompt a number":   {top("prompt = \"1>\""), `line 3: instrument.scope.prompt: "1>": it must begin with no blank, and with nothing that a reply may begin with`},
		"prompt a line end": {top("prompt = \"\\n>\""), "line 3: instrument.scope.prompt: "},
		"echo":              {top("echo = \"yes\""), "line 3"},
		"follows":           {top("follows = \"scpi\""), `line 3: instrument.scope.follows: "scpi": it must be measure-tree`},
		"tree without": {"[instrument.scope]\naddress = \"tcp://a\"\nfollows = \"measure-tree\"\n[instrument.scope.reading.decay_s]\nrepeats = 3\n",
			"line 4: instrument.scope.reading.decay_s: its query is missing: the MEASure tree has none for a decay"},
		"tree of no quantity": {"[instrument.scope]\naddress = \"tcp://a\"\nfollows = \"measure-tree\"\n[instrument.scope.reading.decay]\nrepeats = 3\n",
			`line 4: instrument.scope.reading.decay: "decay" is no reading`},
		"output without off":     {output("on = \"OUTPut ON\""), `line 6: instrument.scope.output: its off is missing: give the message, as in off = "OUTPut OFF"`},
		"output without on":      {output("off = \"OUTPut OFF\""), "line 6: instrument.scope.output: its on is missing"},
		"output empty":           {output("on = []\noff = \"OUTPut OFF\""), "line 6: instrument.scope.output: its on is missing"},
		"output two in one":      {output("on = \"VOLT 5;OUTPut ON\"\noff = \"OUTPut OFF\""), "line 7: instrument.scope.output.on: message"},
		"output of numbers":      {output("on = 1\noff = 0"), "line 7: instrument.scope.output.on: 1 is no message: write it in quotes"},
		"output state":           {output("on = \"OUTPut ON\"\noff = \"OUTPut OFF\"\nstate = \"OUTPut\""), `line 9: instrument.scope.output.state: "OUTPut" is no query`},
		"output state empty":     {output("on = \"OUTPut ON\"\noff = \"OUTPut OFF\"\nstate = \"\""), "line 9: instrument.scope.output.state: it is empty"},
		"output settle":          {output("on = \"OUTPut ON\"\noff = \"OUTPut OFF\"\nsettle = \"2d\""), `line 9: instrument.scope.output.settle: "2d": write a time`},
		"output settle for ever": {output("on = \"OUTPut ON\"\noff = \"OUTPut OFF\"\nsettle = \"2h\""), "line 9: instrument.scope.output.settle: 2h0m0s: it must be nothing to 1h0m0s"},
		"output key":             {output("on = \"OUTPut ON\"\noff = \"OUTPut OFF\"\nvoltage = 48"), "line 9: instrument.scope.output.voltage: there is no such key: an output has on, off, state and settle"},
		"two outputs": {output("on = \"OUTPut ON\"\noff = \"OUTPut OFF\"") + "\n[instrument.spare]\naddress = \"tcp://a\"\n[instrument.spare.output]\non = \"A 1\"\noff = \"A 0\"\n",
			"instrument.spare.output: scope switches the bus already"},
	} {
		t.Run(name, func(t *testing.T) {
			_, err := acquire.ParseRig("rig.toml", []byte(c.text))
			var wrong *acquire.RigError
			if !errors.As(err, &wrong) || !strings.Contains(err.Error(), c.want) || !strings.HasPrefix(err.Error(), "rig.toml") {
				t.Errorf("%v\nwant it to say %s", err, c.want)
			}
		})
	}
	if _, err := acquire.ParseRig("rig.toml", []byte(good)); err != nil {
		t.Errorf("the good one: %v", err)
	}
	if _, err := acquire.ParseRig("rig.toml", []byte(wave)); err != nil {
		t.Errorf("the good one with a waveform: %v", err)
	}
	if rig, err := acquire.ParseRig("rig.toml", []byte(strings.Replace(wave, "[instrument.scope.reading.ring_hz]\nquery = \"MEASure:FREQuency?\"\n", "", 1))); err != nil || len(rig.Instruments[0].Readings) != 0 {
		t.Errorf("a rig that gives nothing but a waveform: %v", err)
	}
	if _, err := acquire.LoadRig(filepath.Join(t.TempDir(), "rig.toml")); err == nil || !strings.Contains(err.Error(), "there is no such file") {
		t.Errorf("no file: %v", err)
	}
}

func FuzzParseRig(f *testing.F) {
	good, err := os.ReadFile("testdata/rig.toml")
	if err != nil {
		f.Fatal(err)
	}
	f.Add(string(good))
	f.Add("[instrument.a]\nx = 1\n")
	f.Add("instrument = 3\n")
	f.Add("[instrument.a]\naddress = \"tcp://a\"\n[instrument.a.waveform]\nquery = \"A?\"\nformat = \"ascii\"\ninterval_s = \"B?\"\ntake = [\"*OPC?\"]\n")
	f.Add("[[instrument]]\naddress = \"x\"\n")
	f.Add("[instrument.\"\"]\n")
	f.Fuzz(func(t *testing.T, text string) {
		rig, err := acquire.ParseRig("rig.toml", []byte(text))
		if err == nil && rig.Check() != nil {
			t.Fatalf("what was read does not stand its own check: %v", rig.Check())
		}
	})
}
