package device

import (
	"fmt"
	"strings"
	"testing"
)

// meter is an instrument with one of everything.
func meter(t testing.TB) *Instrument {
	t.Helper()
	volts := 0.0
	in, err := New("RINGBOOK,TEST METER,0,1", func() { volts = 0 }, []Command{
		{Header: "[SOURce]:VOLTage[:LEVel]", Min: 1, Max: 1, Do: func(a []Arg) (string, error) {
			v, err := a[0].Number()
			if err == nil {
				volts = v
			}
			return "", err
		}},
		{Header: "[SOURce]:VOLTage[:LEVel]?", Do: func([]Arg) (string, error) { return NR3(volts, 4), nil }},
		{Header: "MEASure:VOLTage[:DC]?", Do: func([]Arg) (string, error) { return "1.5", nil }},
		{Header: "MEASure:FREQuency?", Do: func([]Arg) (string, error) { return "2.5", nil }},
		{Header: "FIXTure:FIT", Min: 1, Max: 3, Do: func(a []Arg) (string, error) { _, err := a[0].Word(); return "", err }},
		{Header: "OUTPut[:STATe]", Min: 1, Max: 1, Do: func(a []Arg) (string, error) { _, err := a[0].Bool(); return "", err }},
		{Header: "DATA?", Do: func([]Arg) (string, error) { return Block([]byte("a\nb")), nil }},
		{Header: "FAIL", Do: func([]Arg) (string, error) { return "", fmt.Errorf("smoke, \"real\" smoke\n") }},
	})
	if err != nil {
		t.Fatal(err)
	}
	return in
}

// TestMessages checks replies and the error that follows. Codes: SCPI-1999 volume 2, chapter 21.8;
// what each row rests on: IEEE 488.2 chapters 7 and 8, SCPI-1999 volume 1 chapter 6.
func TestMessages(t *testing.T) {
	for _, c := range []struct {
		send, reply string
		code        int
	}{
		{"*IDN?", "RINGBOOK,TEST METER,0,1", 0},
		{"*idn?\r", "RINGBOOK,TEST METER,0,1", 0},
		{" \t*IDN? ", "RINGBOOK,TEST METER,0,1", 0},
		{"", "", 0},
		{"MEAS:VOLT?", "1.5", 0},
		{"measure:voltage:dc?", "1.5", 0},
		{":MEASure:VOLT:DC?", "1.5", 0},
		{"MEAS1:VOLT1?", "1.5", 0},
		{"MEAS:VOLT2?", "", -114},
		{"MEASU:VOLT?", "", -113},
		{"MEAS:VOLT:AC?", "", -113},
		{"MEAS:VOLT", "", -113},
		{"MEAS:VOLT?;FREQ?", "1.5;2.5", 0},
		{"MEAS:VOLT?;*OPC?;FREQ?", "1.5;1;2.5", 0},
		{"MEAS:VOLT?;:MEAS:FREQ?", "1.5;2.5", 0},
		{"MEAS:VOLT?;MEAS:FREQ?", "1.5", -113},
		{"MEAS:VOLT:DC?;FREQ?", "1.5", -113},
		{"MEAS:VOLT?;", "1.5", 0},
		{"VOLT 48;VOLT?", "4.800E+01", 0},
		{"SOURCE:VOLTAGE:LEVEL -1.25e1;:VOLT?", "-1.250E+01", 0},
		{"VOLT .5;:VOLT?", "5.000E-01", 0},
		{"VOLT 5.;:VOLT?", "5.000E+00", 0},
		{"VOLT #H1F;:VOLT?", "3.100E+01", 0},
		{"VOLT #b101;:VOLT?", "5.000E+00", 0},
		{"VOLT 1;*RST;:VOLT?", "0.000E+00", 0},
		{"VOLT", "", -109},
		{"VOLT 1,2", "", -108},
		{"*IDN? 3", "", -108},
		{"VOLT high", "", -104},
		{"VOLT 'x'", "", -104},
		{"VOLT 48V", "", -138},
		{"VOLT 1e", "", -121},
		{"VOLT +", "", -121},
		{"VOLT #HXY", "", -121},
		{"VOLT 1e99999", "", -123},
		{"VOLT 1e999", "", -222},
		{"VOLT " + strings.Repeat("9", 256), "", -124},
		{"VOLT 'x", "", -151},
		{"VOLT #15ab", "", -161},
		{"VOLT #3ab", "", -161},
		{"VOLT 1 2", "", -103},
		{"VOLT 1,", "", -102},
		{"VOLT 1,,2", "", -102},
		{"VOLT(1)", "", -102},
		{"VOLT:", "", -102},
		{";VOLT?", "", -102},
		{"?", "", -102},
		{"VOLT\xff", "", -101},
		{"ABCDEFGHIJKLM?", "", -112},
		{"NOSUCH:THING", "", -113},
		{"FIXT:FIT RC,4.7E-10,10", "", 0},
		{"FIXT:FIT \"it's \"\"so\"\"\"", "", -104},
		{"OUTP ON;:OUTP 0;:OUTP:STAT off", "", 0},
		{"OUTP maybe", "", -224},
		{"DATA?", "#13a\nb", 0},
		{"FAIL", "", -300},
		{"SYST:VERS?", "1999.0", 0},
		{"*TST?;*WAI", "0", 0},
		{"*ESE 36;*ESE?", "36", 0},
		{"*SRE 255;*SRE?", "191", 0},
		{"*ESE 256", "", -222},
	} {
		in := meter(t)
		reply := string(in.Execute([]byte(c.send)))
		want := c.reply
		if want != "" {
			want += "\n"
		}
		if reply != want {
			t.Errorf("%q: reply %q, want %q", c.send, reply, want)
		}
		if got := in.status.next(); got.Code != c.code {
			t.Errorf("%q: error %v, want code %d", c.send, got, c.code)
		}
		if got := in.status.next(); got.Code != 0 {
			t.Errorf("%q: a second error %v", c.send, got)
		}
	}
}

// TestErrorReply checks the form of an entry of the queue: the detail inside the quotes.
func TestErrorReply(t *testing.T) {
	in := meter(t)
	in.Execute([]byte("FAIL"))
	if got, want := string(in.Execute([]byte("SYST:ERR?"))), "-300,\"Device-specific error;smoke, \"\"real\"\" smoke.\"\n"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
	if got, want := string(in.Execute([]byte("SYST:ERR:NEXT?"))), "0,\"No error\"\n"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
}

// TestQueueOverflow: the last entry becomes -350 and the older ones stay; *CLS empties the queue.
func TestQueueOverflow(t *testing.T) {
	in := meter(t)
	in.Execute([]byte("VOLT"))
	for range queueLength + 3 {
		in.Execute([]byte("NOSUCH"))
	}
	var codes []int
	for e := in.status.next(); e.Code != 0; e = in.status.next() {
		codes = append(codes, e.Code)
	}
	if len(codes) != queueLength || codes[0] != -109 || codes[1] != -113 || codes[queueLength-2] != -113 || codes[queueLength-1] != -350 {
		t.Errorf("codes %v", codes)
	}
	in.Execute([]byte("NOSUCH"))
	in.Execute([]byte("*CLS"))
	if e := in.status.next(); e.Code != 0 {
		t.Errorf("after *CLS: %v", e)
	}
}

// TestStatus follows the registers: IEEE 488.2, chapter 11.
func TestStatus(t *testing.T) {
	in := meter(t)
	for _, c := range []struct{ send, reply string }{
		{"*ESR?", "128"}, // power on
		{"*ESR?", "0"},
		{"NOSUCH", ""},
		{"*STB?", "4"},
		{"*IDN?;*STB?", "RINGBOOK,TEST METER,0,1;20"}, // 4 + MAV
		{"*ESE 32;*STB?", "36"},
		{"*SRE 32;*STB?", "100"},
		{"VOLT 1e999", ""},
		{"FAIL", ""},
		{"*OPC", ""},
		{"*ESR?", "57"}, // 32 + 16 + 8 + 1
		{"*STB?", "4"},
		{"*CLS;*STB?", "0"},
	} {
		if got := strings.TrimSuffix(string(in.Execute([]byte(c.send))), "\n"); got != c.reply {
			t.Errorf("%q: reply %q, want %q", c.send, got, c.reply)
		}
	}
}

func TestNewRefuses(t *testing.T) {
	if _, err := New("NO COMMAS", nil, nil); err == nil {
		t.Error("an identity of one field passed")
	}
	for _, h := range []string{"", "lower", "OUTPut[:STATe", "MEAS::VOLT", "[]"} {
		if _, err := New("A,B,0,1", nil, []Command{{Header: h}}); err == nil {
			t.Errorf("the header %q passed", h)
		}
	}
}

func FuzzExecute(f *testing.F) {
	for _, s := range []string{
		"*IDN?", "MEAS:VOLT?;FREQ?", "VOLT 1.5E+3;:OUTP ON", "FIXT:FIT RC,4.7E-10,10", "VOLT #15abcde,'a''b',\"\"",
		"*ESE #HFF;*SRE #Q17;*STB?", ":::;;;", "VOLT #0\x00\xff", "VOLT -", "DATA?;DATA?",
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, message []byte) {
		in := meter(t)
		reply := in.Execute(message)
		if len(reply) > 0 && reply[len(reply)-1] != '\n' {
			t.Errorf("%q: the reply %q has no line feed", message, reply)
		}
		errs := 0
		for e := in.status.next(); e.Code != 0; e = in.status.next() {
			if _, known := texts[e.Code]; !known {
				t.Errorf("%q: code %d has no text", message, e.Code)
			}
			if text := e.Error(); strings.ContainsFunc(text, func(r rune) bool { return r < ' ' || r > '~' }) || strings.Count(text, `"`)%2 != 0 {
				t.Errorf("%q: queued as %q", message, text)
			}
			errs++
		}
		// SYST:ERR? may have taken the one error a message can cause before a later unit caused another,
		// but one message raises one error at most.
		if errs > 1 {
			t.Errorf("%q: %d errors", message, errs)
		}
		if again := meter(t).Execute(message); string(again) != string(reply) {
			t.Errorf("%q: %q, then %q", message, reply, again)
		}
	})
}
