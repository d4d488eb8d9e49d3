package scpi

import (
	"bufio"
	"errors"
	"fmt"
	"io"
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

// Whatever comes, in whatever pieces it is read: the same bytes, and not one beyond the block's own.
func FuzzBlockInPieces(f *testing.F) {
	for _, s := range []string{"#13abc\n", "#0abc\n", "#0\n", "#203\n\n\nnext", "#9999999999", "#", "#1", "1,2,3\r\nnext", "abc"} {
		f.Add([]byte(s), uint8(2), false)
		f.Add([]byte(s), uint8(200), true)
	}
	f.Fuzz(func(t *testing.T, in []byte, piece uint8, text bool) {
		open := openBlock
		if text {
			open = openText
		}
		read := func(r *bufio.Reader, piece int) (body, rest string, err error) {
			b, err := open(r)
			if err != nil {
				return b.head, "", err
			}
			var all []byte
			buf := make([]byte, piece)
			for err == nil {
				var n int
				n, err = b.Read(buf)
				all = append(all, buf[:n]...)
			}
			left, _ := io.ReadAll(r)
			if err == io.EOF && (b.size >= 0 && b.size != int64(len(all)) || b.err != nil) {
				t.Fatalf("%q ended well after %d of %d bytes: %v", in, len(all), b.size, b.err)
			}
			return string(all), string(left), err
		}
		body, rest, err := read(bufio.NewReader(strings.NewReader(string(in))), 1+len(in))
		body2, rest2, err2 := read(bufio.NewReaderSize(iotestOneByte{strings.NewReader(string(in))}, 16), 1+int(piece))
		if body != body2 || rest != rest2 || fmt.Sprint(err) != fmt.Sprint(err2) {
			t.Fatalf("%q: %q, %q, %v at once; %q, %q, %v in pieces", in, body, rest, err, body2, rest2, err2)
		}
		if err == io.EOF && !strings.HasSuffix(string(in), rest) || len(body)+len(rest) > len(in) {
			t.Fatalf("%q: body %q, rest %q", in, body, rest)
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
