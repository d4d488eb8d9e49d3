package scpi

import (
	"bufio"
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"
)

func FuzzParseNumber(f *testing.F) {
	for _, s := range []string{"12", "-1.5", "+6.18000000E+07", "9.91E37", "9.91 E37", "-9.9E37", "#H1F", "0x1p-2", "1_0", "NaN", ".", "1E400", "1e-999", "+.5E +3"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		v, err := ParseNumber(s)
		if (err != nil) != math.IsNaN(v) {
			t.Fatalf("ParseNumber(%q) = %g, %v", s, v, err)
		}
		if math.Abs(v) >= 9.8999999e37 {
			t.Fatalf("ParseNumber(%q) = %g: that is no reading", s, v)
		}
		if err != nil {
			return
		}
		// What was read can be sent, and read again.
		again, err := ParseNumber(formatNR3(v))
		if err != nil || again != v {
			t.Fatalf("%q read as %g, sent as %s, read as %g, %v", s, v, formatNR3(v), again, err)
		}
	})
}

func FuzzParseString(f *testing.F) {
	for _, s := range []string{`"abc"`, `"a""b"`, `'it''s'`, `"`, `""`, `"""`, `"a"b`} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		text, err := ParseString(s)
		if err != nil {
			return
		}
		again, err := ParseString(`"` + strings.ReplaceAll(text, `"`, `""`) + `"`)
		if err != nil || again != text {
			t.Fatalf("%q read as %q, then as %q, %v", s, text, again, err)
		}
	})
}

func FuzzParseErrorEntry(f *testing.F) {
	for _, s := range []string{`0,"No error"`, `+0,"No error"`, `-113,"Undefined header;X"`, "0,No error", "1,2", "-350,'Queue overflow'", ","} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		n, text, err := ParseErrorEntry(s)
		if err != nil {
			return
		}
		n2, text2, err := ParseErrorEntry(fmt.Sprintf(`%+d,"%s"`, n, strings.ReplaceAll(text, `"`, `""`)))
		if err != nil || n2 != n || text2 != text {
			t.Fatalf("%q read as %d, %q, then as %d, %q, %v", s, n, text, n2, text2, err)
		}
		// No number passes for an entry: it may be a late reply.
		if _, err := ParseNumber(s); err == nil {
			t.Fatalf("%q passes both for a number and for an entry of the queue", s)
		}
	})
}

func FuzzReadBlock(f *testing.F) {
	for _, s := range []string{"#13abc\n", "#0abc\n", "#203\n\n\n", "#9999999999", "#", "#x", " \r\n#10", "abc"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, in []byte) {
		const limit = 1000
		r := bufio.NewReader(strings.NewReader(string(in)))
		b, err := ReadBlock(r, limit)
		if len(b) > limit+2 || err == nil && len(b) > limit {
			t.Fatalf("%d bytes came out, the limit is %d", len(b), limit)
		}
		if err != nil || strings.HasPrefix(strings.TrimLeft(string(in), " \t\r\n\x00"), "#0") {
			return // an indefinite block has another length than a definite one of the same bytes
		}
		again, err := ReadBlock(bufio.NewReader(strings.NewReader(fmt.Sprintf("#9%09d%s", len(b), b))), limit)
		if err != nil || string(again) != string(b) {
			t.Fatalf("%q came back as %q, %v", b, again, err)
		}
	})
}

func FuzzParseUnit(f *testing.F) {
	for _, s := range []string{"*IDN?", "MEASure:FREQuency? CHANnel1", "VOLT 5;*RST", "VOLT 5\n*RST", ":A:B 1,2", "* 1", "A::B", "A\xff"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		header, args, err := ParseUnit(s)
		if err != nil {
			return
		}
		msg, err := message(header, args)
		if err != nil || strings.ContainsAny(msg, "\r\n;\x00") {
			t.Fatalf("%q became %q, %v", s, msg, err)
		}
		var instrument *InstrumentError
		if errors.As(err, &instrument) {
			t.Fatal("nothing was sent")
		}
	})
}
