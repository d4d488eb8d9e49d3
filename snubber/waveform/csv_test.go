package waveform

import (
	"bytes"
	"compress/gzip"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"
	"testing/iotest"
)

func zipped(t testing.TB, text string) string {
	t.Helper()
	var b bytes.Buffer
	z := gzip.NewWriter(&b)
	if _, err := io.WriteString(z, text); err != nil {
		t.Fatal(err)
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestReadCSVForms(t *testing.T) {
	want := []float64{0.25, -1.5, 3}
	for name, text := range map[string]string{
		"plain":            "0,0.25\n1e-9,-1.5\n2e-9,3\n",
		"no last line end": "0,0.25\n1e-9,-1.5\n2e-9,3",
		"header":           "time_s,voltage_v\n0,0.25\n1e-9,-1.5\n2e-9,3\n",
		"quoted header":    "\"time; in, s\",\"the \"\"drain\"\"\"\n0,0.25\n1e-9,-1.5\n2e-9,3\n",
		"quoted numbers":   "\"0\",\"0.25\"\n\"1e-9\" ,-1.5\n2e-9, \"3\"\n",
		"comments":         "# bench 2\n# 3, 4, 5\ntime,volts\n0,0.25\n# probe moved\n1e-9,-1.5\n2e-9,3\n",
		"semicolons":       "time;volts, drain\n0;0.25\n1e-9;-1.5\n2e-9;3\n",
		"tabs":             "time\tvolts; drain\n0\t0.25\n1e-9\t-1.5\n2e-9\t3\n",
		"CR LF":            "time,volts\r\n0,0.25\r\n1e-9,-1.5\r\n2e-9,3\r\n",
		"byte order mark":  "\ufeff0,0.25\n1e-9,-1.5\n2e-9,3\n",
		"blank rows":       "\n0,0.25\n\n1e-9,-1.5\n2e-9,3\n,\n  \n\n",
		"empty third":      "time,volts,\n0,0.25,\n1e-9,-1.5,\n2e-9,3,,\n",
		"spaces":           " time , volts \n 0 , 0.25 \n 1e-9 , -1.5\n 2e-9 , +3.\n",
		"engineering":      "0,250m\n1n,-1.5V\n2 ns,3000 mV\n",
		"gzip":             zipped(t, "time,volts\n0,0.25\n1e-9,-1.5\n2e-9,3\n"),
		"gzip in two":      zipped(t, "time,volts\n0,0.25\n1e-") + zipped(t, "9,-1.5\n2e-9,3\n"),
		"gzip with a mark": zipped(t, "\ufefftime,volts\r\n0,0.25\r\n1e-9,-1.5\r\n2e-9,3\r\n"),
	} {
		r, err := ReadCSV(iotest.OneByteReader(strings.NewReader(text)), "edge.csv")
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if fmt.Sprint(r.Volts) != fmt.Sprint(want) || r.Start != 0 || r.Interval != 1e-9 || r.Origin != "edge.csv" || r.StepV != 0 {
			t.Errorf("%s: %+v", name, r)
		}
	}
}

// rows writes n samples with the times that at gives.
func rows(n int, at func(i int) string) string {
	var b strings.Builder
	for i := range n {
		fmt.Fprintf(&b, "%s,%d\n", at(i), i%7)
	}
	return b.String()
}

func TestReadCSVErrors(t *testing.T) {
	whole := zipped(t, rows(5000, func(i int) string { return fmt.Sprintf("%.4e", float64(i)*1e-9) }))
	flipped := []byte(whole)
	flipped[len(flipped)-6] ^= 1
	for name, c := range map[string]struct{ text, want string }{
		"empty":              {"", "edge.csv is empty"},
		"comments alone":     {"# one\n# two\n", "no samples in its 2 lines"},
		"header alone":       {"time,volts\n", "no samples in its 1 lines"},
		"one sample":         {"time,volts\n0,1\n", "one sample, on line 2"},
		"one column":         {"0\n1\n", `line 1 has one column ("0")`},
		"spaces between":     {"0 1\n1 2\n", `line 1 has one column ("0 1")`},
		"one column later":   {"0,1\n1,2\n2\n", `line 3 has one column ("2")`},
		"three columns":      {"time,ch1,ch2\n0,1,2\n", `line 1, column 3 ("ch2")`},
		"three numbers":      {"0,1,2\n", `line 1, column 3 ("2")`},
		"text for volts":     {"0,1\n1,high\n", `line 2, column 2 (volts): quantity "high"`},
		"text for time":      {"0,1\nnow,2\n", `line 2, column 1 (time): quantity "now"`},
		"text in line 1":     {"0,volts\n", `line 1, column 2 (volts): quantity "volts"`},
		"two headers":        {"time,volts\nsecond,volt\n0,1\n", `line 2: a second row of text above the samples ("second")`},
		"no volts":           {"0,1\n1,\n", `line 2, column 2 (volts): quantity ""`},
		"doubled quotes":     {"0,\"1\"\"2\"\n", `line 1, column 2 (volts): quantity "1\"2"`},
		"decimal comma":      {"0;1,5\n1;2\n", `line 1, column 2 (volts): quantity "1,5": a comma was found`},
		"NaN":                {"0,1\n1,NaN\n2,3\n", `line 2, column 2 (volts): quantity "NaN"`},
		"NaN first":          {"nan,nan\n1,NaN\n2,3\n", `line 1, column 1 (time): quantity "nan"`},
		"Inf":                {"0,1\n1,-inf\n2,3\n", `line 2, column 2 (volts): quantity "-inf"`},
		"too large":          {"0,1\n1,1e999\n", `line 2, column 2 (volts): quantity "1e999"`},
		"hexadecimal":        {"0,1\n1,0x10\n", `line 2, column 2 (volts): quantity "0x10"`},
		"other unit":         {"0,1\n1,3A\n", `line 2, column 2 (volts): quantity "3A"`},
		"nanoseconds":        {"time (ns),volts\n0,1\n1,2\n", `line 1, column 1 ("time (ns)") is in ns: write it in seconds`},
		"millivolts":         {"time_s,drain_mV\n0,1\n1,2\n", `line 1, column 2 ("drain_mV") is in mV: write it in volts`},
		"equal times":        {"t,v\n0,1\n1,2\n1,3\n", "line 4, column 1 (time): 1 s comes after 1 s: times must rise"},
		"back in time":       {"0,1\n1,2\n0.5,3\n", "line 3, column 1 (time): 0.5 s comes after 1 s"},
		"open quote":         {"\"time,volts\n0,1\n", "line 1, column 1: a quotation mark is opened"},
		"text after a quote": {"\"0\"1,2\n", "line 1, column 1: text follows the closing quotation mark"},
		"lone returns":       {"0,1\r1,2\r2,3\r", "line 1 has a carriage return"},
		"UTF-16":             {"\xff\xfe0\x00,\x001\x00", "UTF-16"},
		"a long line":        {"0,1\n" + strings.Repeat("1,2 ", 30000), "line 2 is longer than 65536 bytes"},
		"gzip of nothing":    {zipped(t, ""), "is empty"},
		"gzip cut off":       {whole[:len(whole)/2], "is gzip that is damaged or cut off"},
		"gzip cut to 5":      {whole[:5], "is gzip that is damaged or cut off"},
		"gzip with a fault":  {string(flipped), "is gzip that is damaged or cut off"},
		"a picture":          {"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR", "line 1 has one column"},
		"overflow":           {"-1.7e308,1\n1.7e308,2\n", "no interval between samples"},
	} {
		_, err := ReadCSV(strings.NewReader(c.text), "edge.csv")
		if err == nil {
			t.Errorf("%s: no error", name)
			continue
		}
		if s := err.Error(); !strings.Contains(s, c.want) || !strings.HasPrefix(s, "edge.csv ") || strings.Contains(s, "\n") || len(s) > 400 {
			t.Errorf("%s: %s", name, s)
		}
	}
	_, err := ReadCSV(iotest.TimeoutReader(strings.NewReader(rows(20000, strconv.Itoa))), "")
	if !errors.Is(err, iotest.ErrTimeout) || !strings.HasPrefix(err.Error(), "the waveform after line ") {
		t.Errorf("a reader that fails: %v", err)
	}
}

// Times printed with few digits are rounded, and no more than that.
func TestReadCSVRoundedTimes(t *testing.T) {
	for _, c := range []struct {
		format          string
		start, interval float64
		n               int
	}{
		{"%.6g", 0, 0.5037e-9, 10000},    // a unit of the last place is 2 % of the step
		{"%.5g", -1e-6, 0.5037e-9, 3000}, // 20 %, and times near zero
		{"%.10f", 0.25, 5.037e-10, 5000}, // 20 %, far from zero
		{"%.3e", 0, 1e-9, 1000},          // every one exact
		{"%g", 1e-3, 1. / 3 * 1e-9, 100}, // an interval of no short decimal
		{"%.9g", 12.5, 1.0007e-6, 4000},
	} {
		text := rows(c.n, func(i int) string { return fmt.Sprintf(c.format, c.start+float64(i)*c.interval) })
		if c.format == "%g" {
			text = rows(c.n, func(i int) string { return fmt.Sprint(c.start + float64(i)*c.interval) })
		}
		r, err := ReadCSV(strings.NewReader(text), "")
		if err != nil {
			t.Errorf("%+v: %v", c, err)
			continue
		}
		if math.Abs(r.Interval/c.interval-1) > 1e-9 || math.Abs(r.Start-c.start) > c.interval/4 {
			t.Errorf("%+v: start %g, interval %g", c, r.Start, r.Interval)
		}
	}
}

func TestReadCSVUneven(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 1))
	times := func(n int, step func(i int) float64) string {
		at := 0.0
		return rows(n, func(i int) string {
			if i > 0 {
				at += step(i)
			}
			return strconv.FormatFloat(at, 'g', -1, 64)
		})
	}
	rounded := func(n, digits int, skip func(i int) int) string {
		return rows(n, func(i int) string { return fmt.Sprintf("%.*g", digits, float64(skip(i))*0.5e-9) })
	}
	for name, c := range map[string]struct{ text, want string }{
		"a missing sample":                  {times(1000, func(i int) float64 { return 1e-9 * float64(1+b2i(i == 700)) }), "line 701, column 1 (time): a step of 2e-09 s"},
		"a missing second sample":           {times(10, func(i int) float64 { return 1e-9 * float64(1+b2i(i == 1)) }), "line 2, column 1 (time): a step of 2e-09 s"},
		"a missing sample but one":          {times(10, func(i int) float64 { return 1e-9 * float64(1+b2i(i == 9)) }), "line 10, column 1 (time): a step of 2e-09 s"},
		"a missing sample, rounded times":   {rounded(10000, 5, func(i int) int { return i + b2i(i >= 6000) }), "line 6001, column 1 (time): a step of 1e-09 s"},
		"a missing sample of whole numbers": {"0,1\n1,1\n2,1\n4,1\n5,1\n", "line 4, column 1 (time): a step of 2 s"},
		"a sample too many":                 {times(1000, func(i int) float64 { return 1e-9 / float64(1+b2i(i/2 == 250)) }), "a sample too many stands there"},
		"a late sample":                     {times(1000, func(i int) float64 { return 1e-9 * (1 + 0.015*float64(b2i(i == 41)-b2i(i == 42))) }), "line 42, column 1 (time): a step of 1.015e-09 s"},
		"jitter":                            {times(1000, func(int) float64 { return 1e-9 * (1 + 0.03*(random.Float64()-0.5)) }), "even to within 1 %"},
		"two rates":                         {times(1000, func(i int) float64 { return 1e-9 * (1 + 0.05*float64(b2i(i > 500))) }), "even to within 1 %"},
		"two rates, rounded times":          {rows(4000, func(i int) string { return fmt.Sprintf("%.5g", (float64(i)+0.1*float64(max(0, i-2000)))*0.5e-9) }), "mean step"},
		"two rates, 100 rounded times":      {rows(100, func(i int) string { return fmt.Sprintf("%.2g", (float64(i)+0.1*float64(max(0, i-50)))*0.5e-8+1e-7) }), "line "},
		"logarithmic":                       {rows(50, func(i int) string { return fmt.Sprint(1e-9 * math.Pow(1.1, float64(i))) }), "even to within 1 %"},
		"rounded to a third of the step":    {rows(100, func(i int) string { return fmt.Sprintf("%.1f", float64(i)*0.31) }), "print the times with more digits"},
	} {
		_, err := ReadCSV(strings.NewReader(c.text), "edge.csv")
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v", name, err)
		}
	}
	even := times(1000, func(int) float64 { return 1e-9 * (1 + 0.015*(random.Float64()-0.5)) })
	if _, err := ReadCSV(strings.NewReader(even), "edge.csv"); err != nil {
		t.Errorf("even to within 0.75 %%: %v", err)
	}
}

func b2i(b bool) int {
	if b {
		return 1
	}
	return 0
}

func TestWriteCSVRoundTrip(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 2))
	for _, n := range []int{2, 3, 1000, 100_000} {
		for _, interval := range []float64{1e-9, 0.5e-9, 3.2e-10, 1e-6, 4e-11, 1.0 / 3e9} {
			for _, start := range []float64{0, -1e-6, 3.7e-4, 1e-12, -5} {
				r := Record{Start: start, Interval: interval, Volts: make([]float64, n)}
				for i := range r.Volts {
					r.Volts[i] = random.NormFloat64() * math.Pow(10, float64(random.IntN(40)-20))
				}
				r.Volts[0], r.Volts[1] = math.Copysign(0, -1), 5e-324
				var b bytes.Buffer
				err := WriteCSV(&b, r)
				if err != nil {
					t.Fatal(err)
				}
				back, err := ReadCSV(&b, "")
				if err != nil {
					t.Fatalf("n %d interval %g start %g: %v", n, interval, start, err)
				}
				if math.Float64bits(back.Start) != math.Float64bits(r.Start) {
					t.Errorf("start %g comes back as %g", r.Start, back.Start)
				}
				top := max(math.Abs(r.Start), math.Abs(r.TimeAt(n-1)))
				off := math.Abs(back.Interval - r.Interval)
				if off > 1e-15*top/float64(n-1) || (interval != 1.0/3e9 && start != -5 && off != 0) {
					t.Errorf("start %g, %d samples: interval %v comes back as %v", start, n, r.Interval, back.Interval)
				}
				for i, v := range r.Volts {
					if math.Float64bits(v) != math.Float64bits(back.Volts[i]) {
						t.Fatalf("sample %d: %g comes back as %g", i, v, back.Volts[i])
					}
				}
			}
		}
	}
	full := errors.New("disk full")
	if err := WriteCSV(failing{full}, Record{Interval: 1, Volts: make([]float64, 10)}); !errors.Is(err, full) {
		t.Errorf("a writer that fails: %v", err)
	}
	if err := WriteCSV(io.Discard, Record{Start: 1e6, Interval: 1e-9, Volts: []float64{1, 2}}); err == nil || !strings.Contains(err.Error(), "nearer to 0 s") {
		t.Errorf("steps of 1 ns at 1 Ms: %v", err)
	}
	if err := WriteCSV(io.Discard, Record{Interval: 1, Volts: []float64{1}}); err == nil {
		t.Error("one sample: no error")
	}
	if err := WriteCSV(io.Discard, Record{Interval: 1, Volts: []float64{1, math.NaN()}}); err == nil {
		t.Error("NaN: no error")
	}
}

type failing struct{ err error }

func (f failing) Write([]byte) (int, error) { return 0, f.err }

func FuzzReadCSV(f *testing.F) {
	for _, s := range []string{
		"", "time,volts\n0,1\n1e-9,2\n", "# c\n0;1\n1;2\n2;3", "\ufeff0\t1\r\n1n\t2V\r\n", "\"0\",\"1\"\"\"\n", "0,1,\n,,\n1,2,3",
		"-1.7e308,1\n1.7e308,2\n", "0,5e-324\n5e-324,-0\n", zipped(f, "0,1\n1,2\n"), "0,1\r1,2\r", "\xff\xfe0", "nan,inf\n",
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		r, err := ReadCSV(bytes.NewReader(text), "f")
		if err != nil {
			if strings.Contains(err.Error(), "\n") {
				t.Fatalf("an error of two lines: %q", err)
			}
			return
		}
		if err := r.Check(); err != nil {
			t.Fatalf("%q reads as a record that is none: %v", text, err)
		}
		var b bytes.Buffer
		if err := WriteCSV(&b, r); err != nil {
			return // times too far from zero for their steps
		}
		back, err := ReadCSV(bytes.NewReader(b.Bytes()), "f")
		if err != nil {
			t.Fatalf("%q is not read back: %v", b.String(), err)
		}
		if math.Float64bits(back.Start) != math.Float64bits(r.Start) || math.Abs(back.Interval/r.Interval-1) > 0.01 || len(back.Volts) != len(r.Volts) {
			t.Fatalf("%+v comes back as %+v", r, back)
		}
		for i := range r.Volts {
			if math.Float64bits(back.Volts[i]) != math.Float64bits(r.Volts[i]) {
				t.Fatalf("sample %d: %g comes back as %g", i, r.Volts[i], back.Volts[i])
			}
		}
	})
}

// Ten million samples, beside encoding/csv with strconv.ParseFloat on the same text in the same run.
func BenchmarkReadCSV(b *testing.B) {
	for _, n := range []int{10_000, 1_000_000, 10_000_000} {
		random := rand.New(rand.NewPCG(5, 3))
		r := Record{Interval: 0.5e-9, Volts: make([]float64, n)}
		for i := range r.Volts {
			r.Volts[i] = math.Round(random.NormFloat64()*1e4) / 1e3
		}
		var text bytes.Buffer
		if err := WriteCSV(&text, r); err != nil {
			b.Fatal(err)
		}
		b.Run(fmt.Sprintf("n=%d/ours", n), func(b *testing.B) {
			b.ReportAllocs()
			b.SetBytes(int64(text.Len()))
			for b.Loop() {
				if _, err := ReadCSV(bytes.NewReader(text.Bytes()), ""); err != nil {
					b.Fatal(err)
				}
			}
		})
		b.Run(fmt.Sprintf("n=%d/encoding-csv", n), func(b *testing.B) {
			b.SetBytes(int64(text.Len()))
			for b.Loop() {
				in := csv.NewReader(bytes.NewReader(text.Bytes()))
				in.ReuseRecord = true
				var volts []float64
				for {
					row, err := in.Read()
					if err == io.EOF {
						break
					}
					if err != nil {
						b.Fatal(err)
					}
					if _, err := strconv.ParseFloat(row[0], 64); err != nil {
						continue
					}
					v, err := strconv.ParseFloat(row[1], 64)
					if err != nil {
						b.Fatal(err)
					}
					volts = append(volts, v)
				}
				if len(volts) != n {
					b.Fatalf("%d samples", len(volts))
				}
			}
		})
	}
}

// The quick way to a number gives what strconv.ParseFloat gives, to the bit, or leaves it alone.
func TestPlainNumber(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 4))
	texts := []string{"0", "-0", "+0.0", "1e22", "1e23", "9007199254740993", "9007199254740992e-22", ".5", "5.", ".", "", "-", "1e", "1e+", "1e5x", "1..2", "1e1.5",
		"00000000000000000000000001", "0.00000000000000000000000000001", "123456789012345678901234567890", "1e-400", "1e99999999999", "18446744073709551617", "--1", "1-", "e5", "1_0"}
	for range 20000 {
		v := random.NormFloat64() * math.Pow(10, float64(random.IntN(60)-30))
		texts = append(texts, strconv.FormatFloat(v, "gfe"[random.IntN(3)], random.IntN(18)-1, 64))
	}
	quick := 0
	for _, s := range texts {
		got, _, ok := plainNumber([]byte(s))
		if !ok {
			continue
		}
		quick++
		if want, err := strconv.ParseFloat(s, 64); err != nil || math.Float64bits(want) != math.Float64bits(got) {
			t.Errorf("%q: %g, want %g (%v)", s, got, want, err)
		}
	}
	if quick < len(texts)/4 {
		t.Errorf("%d of %d numbers are read the quick way", quick, len(texts))
	}
}
