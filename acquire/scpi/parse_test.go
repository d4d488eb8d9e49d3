package scpi

import (
	"bufio"
	"encoding/csv"
	"errors"
	"io"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"
)

func TestParseNumber(t *testing.T) {
	for in, want := range map[string]float64{
		"12": 12, "-7": -7, "+0": 0, "1.25": 1.25, ".5": .5, "5.": 5, "+1e-3": 1e-3,
		"+6.18000000E+07": 61.8e6, "1.8 E6": 1.8e6, "1.8E +6": 1.8e6, "  3.3E+00\r\n": 3.3, "-9.8E37": -9.8e37,
		"#H1F": 31, "#q17": 15, "#B101": 5, "1E-400": 0,
	} {
		got, err := ParseNumber(in)
		if err != nil || got != want {
			t.Errorf("ParseNumber(%q) = %g, %v; want %g", in, got, err, want)
		}
	}
	for _, in := range []string{
		"", " ", "+", ".", "E3", "1E", "1E+", "1.2.3", "1,2", "1 2", "0x10", "1_000", "Inf", "NaN", "--1",
		"1.8E6 HZ", "V 3", "#", "#H", "#HG", "#H0x1", "#B2", "#H-1", "#14abcd", "\"1\"", "1e5\x00",
	} {
		if got, err := ParseNumber(in); err == nil || !math.IsNaN(got) || errors.Is(err, ErrNoReading) {
			t.Errorf("ParseNumber(%q) = %g, %v; want a refusal", in, got, err)
		}
	}
}

// The three forms in which sources print it, single precision, and both infinities.
func TestParseNumberNoReading(t *testing.T) {
	for _, in := range []string{
		"9.91E37", "9.91e37", "9.91 E37", "+9.910000E+37", "9.91E+37", "99.1E36", "9.8999998E+37", "9.9E37", "-9.9E37", "-9.90000E+37",
		strconv.FormatFloat(float64(float32(9.9e37)), 'E', -1, 64), strconv.FormatFloat(float64(float32(9.91e37)), 'E', -1, 64), "1E400",
	} {
		got, err := ParseNumber(in)
		if !errors.Is(err, ErrNoReading) || !math.IsNaN(got) {
			t.Errorf("ParseNumber(%q) = %g, %v; want NaN and ErrNoReading", in, got, err)
		}
	}
}

func TestParseString(t *testing.T) {
	for in, want := range map[string]string{`"abc"`: "abc", ` "a""b" `: `a"b`, `'it''s'`: "it's", `""`: "", `"'"`: "'"} {
		if got, err := ParseString(in); err != nil || got != want {
			t.Errorf("ParseString(%q) = %q, %v; want %q", in, got, err, want)
		}
	}
	for _, in := range []string{"", "abc", `"abc`, `"a" "b"`, `"a"b`, `"""`, `'a"`} {
		if got, err := ParseString(in); err == nil {
			t.Errorf("ParseString(%q) = %q; want a refusal", in, got)
		}
	}
}

func TestParseErrorEntry(t *testing.T) {
	for _, c := range []struct {
		in     string
		number int
		text   string
	}{
		{`0,"No error"`, 0, "No error"},
		{`+0,"No error"`, 0, "No error"},
		{`-113,"Undefined header;FOO:BAR?"`, -113, "Undefined header;FOO:BAR?"},
		{"-222, 'Data out of range'\r\n", -222, "Data out of range"},
		{`0,No error`, 0, "No error"},
		{`1201,"the lamp is out"`, 1201, "the lamp is out"},
	} {
		n, text, err := ParseErrorEntry(c.in)
		if err != nil || n != c.number || text != c.text {
			t.Errorf("ParseErrorEntry(%q) = %d, %q, %v", c.in, n, text, err)
		}
	}
	// A late reply to another query must not pass for an entry.
	for _, in := range []string{"", "0", "+0", "1.8E6", "1,2", "1.0,\"x\"", "0,", "0,\"No error", "99999,\"x\"", "Example,Meter,1,2", `"No error"`} {
		if n, text, err := ParseErrorEntry(in); err == nil {
			t.Errorf("ParseErrorEntry(%q) = %d, %q; want a refusal", in, n, text)
		}
	}
}

// Texts and classes of SCPI-1999, Volume 2, chapter 21, through secondary copies: two lists of the codes
// and several programming manuals agree on testdata/scpi_errors.csv.
func TestClassAndESR(t *testing.T) {
	f, err := os.Open("testdata/scpi_errors.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil || len(rows) != 1+83 {
		t.Fatalf("%d rows, %v", len(rows), err)
	}
	for _, row := range rows[1:] {
		n, _ := strconv.Atoi(row[0])
		class := map[string]Class{
			"none": NoError, "command": CommandError, "execution": ExecutionError, "device": DeviceError, "query": QueryError,
			"power on": PowerOn, "user request": UserRequest, "request control": RequestControl, "operation complete": OperationComplete,
		}[row[2]]
		weight, _ := strconv.Atoi(row[4])
		if got := ClassOf(n); got != class || got.ESR() != weight {
			t.Errorf("%d: class %q, ESR %d; want %q, %d", n, got, got.ESR(), class, weight)
		}
	}
	if ClassOf(3000) != DeviceError || ClassOf(-1) != Reserved || ClassOf(-950) != Reserved || Reserved.ESR() != 0 {
		t.Error("a positive number is the device's, one outside the classes is reserved")
	}
}

func TestReadBlock(t *testing.T) {
	for _, c := range []struct{ in, want, rest string }{
		{"#13abc\n", "abc", "\n"},
		{"#13a\nc\n", "a\nc", "\n"},
		{"\r\n #203\n\n\n", "\n\n\n", ""},
		{"#10\n", "", "\n"},
		{"#0abc\nnext", "abc", "next"},
		{"#9000000002xyz", "xy", "z"},
		{"#800000080" + strings.Repeat("\xff", 80), strings.Repeat("\xff", 80), ""},
	} {
		r := bufio.NewReader(iotestOneByte{strings.NewReader(c.in)})
		got, err := ReadBlock(r, 100)
		rest, _ := io.ReadAll(r)
		if err != nil || string(got) != c.want || string(rest) != c.rest {
			t.Errorf("ReadBlock(%q) = %q, %v, leaving %q", c.in, got, err, rest)
		}
	}
	for in, want := range map[string]error{
		"": io.EOF, "#": io.ErrUnexpectedEOF, "#3": io.ErrUnexpectedEOF, "#312": io.ErrUnexpectedEOF, "#15abc": io.ErrUnexpectedEOF,
		"#0abc": io.ErrUnexpectedEOF, "abc": errNotBlock, "#x": errNotBlock, "#1-": errNotBlock, "#3101": errTooLong,
		"#9999999999": errTooLong, "#0" + strings.Repeat("x", 101) + "\n": errTooLong,
	} {
		if got, err := ReadBlock(bufio.NewReader(strings.NewReader(in)), 100); !errors.Is(err, want) {
			t.Errorf("ReadBlock(%q) = %q, %v; want %v", in, got, err, want)
		}
	}
}

// iotestOneByte gives one byte at a time, as a slow serial port does.
type iotestOneByte struct{ r io.Reader }

func (o iotestOneByte) Read(p []byte) (int, error) {
	if len(p) == 0 {
		return 0, nil
	}
	return o.r.Read(p[:1])
}
